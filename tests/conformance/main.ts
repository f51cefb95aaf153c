import { parseArgs } from 'node:util'
import { runConformance } from './benchConformance.ts'

const { values } = parseArgs({
  options: { token: { type: 'string' }, port: { type: 'string', default: '4190' } },
})
if (!values.token)
  throw new Error('Name the token that your bench uses: --token TOKEN (20 characters or more).')

const report = await runConformance(
  { token: values.token, port: Number(values.port), patienceMs: 30_000, stayAwayMs: 5000 },
  (url) => console.log(`Point your bench at ${url}, namespace /bench, with that token. Waiting 30 s for it.`),
)
for (const check of report.checks)
  console.log(
    `${check.passed ? 'kept  ' : 'BROKEN'}  ${check.name}${check.detail ? `: ${check.detail}` : ''}`,
  )
console.log(report.passed ? 'The bench keeps to protocol 1.' : 'The bench does not keep to protocol 1 yet.')
process.exitCode = report.passed ? 0 : 1
