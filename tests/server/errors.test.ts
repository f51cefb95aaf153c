import { describe, expect, it } from 'vitest'
import { ERRORS, ERROR_CODES, Problem } from '../../src/shared/contract/errors.ts'
import { ROUTES } from '../../src/shared/contract/routes.ts'
import { AppError, STATUS_OF, problemOf } from '../../server/errors.ts'

describe('STATUS_OF', () => {
  it('holds an HTTP error status for every code of the contract and for nothing else', () => {
    expect(Object.keys(STATUS_OF).toSorted()).toEqual(ERROR_CODES.toSorted())
    for (const status of Object.values(STATUS_OF)) {
      expect(Number.isInteger(status)).toBe(true)
      expect(status).toBeGreaterThanOrEqual(400)
      expect(status).toBeLessThan(600)
    }
  })

  it('knows every code that a route names', () => {
    for (const { errors } of Object.values(ROUTES))
      for (const code of errors) expect(STATUS_OF).toHaveProperty([code])
  })
})

describe('problemOf()', () => {
  it.each(ERROR_CODES)('gives the agreed shape for %s', (code) => {
    const problem = Problem.parse(problemOf(new AppError(code), 'r1'))
    expect(problem).toEqual({
      type: `urn:problem-type:evenstrung:${code}`,
      code,
      title: ERRORS[code].title,
      remedy: ERRORS[code].remedy,
      status: STATUS_OF[code],
      requestId: 'r1',
    })
  })

  it('carries detail, fields and facts', () => {
    const details = {
      detail: 'more',
      fields: [{ path: 'email', message: 'not right' }],
      facts: { waitSeconds: 3, serial: 'HL2400001', open: true, until: null },
    }
    expect(Problem.parse(problemOf(new AppError('sign-in.wait', details)))).toMatchObject(details)
  })

  it('tells nothing of an unknown error', () => {
    for (const thrown of [new Error('inside'), 'inside', null, undefined, { inside: true }]) {
      const problem = problemOf(thrown)
      expect(problem.code).toBe('server.error')
      expect(JSON.stringify(problem)).not.toContain('inside')
    }
  })

  it('says that the database is away when the driver does', () => {
    const refused = Object.assign(new Error('connect ECONNREFUSED'), { code: 'ECONNREFUSED' })
    expect(problemOf(refused)).toMatchObject({ code: 'storage.away', status: 503 })
  })
})
