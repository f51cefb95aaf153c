import { ApiProblem } from '../../src/api/apiProblem.ts'
import { ERRORS, type ErrorCode } from '../../src/shared/contract/errors.ts'
import type { RouteKey } from '../../src/shared/contract/routes.ts'
import { IDS } from '../fixtures/runParts.ts'
import { bench, instrument, model, person, scene, traceOf } from './scenes.ts'

const refuse = (code: ErrorCode, status: number, facts = {}): never => {
  throw new ApiProblem({ type: `/problems/${code}`, code, status, ...ERRORS[code], facts })
}

const HOLDER = { runId: IDS.run, serial: 'HL2401866', person: 'Second hand', bench: 'Window' }

const ANSWERS: Partial<Record<RouteKey, () => unknown>> = {
  'auth.me': () => ({
    person,
    tokenUntil: '2026-12-01T23:00:00.000Z',
    sessionId: IDS.action,
    workshop: { name: 'Harrow Lane Instruments', timeZone: 'Europe/London' },
  }),
  'benches.list': () => ({ items: [bench] }),
  'models.list': () => ({ items: [model] }),
  'cautions.read': () => ({ acknowledged: scene.cautionsRead ?? true, shift: 'early', acknowledgedAt: null }),
  'cautions.acknowledge': () => ({ acknowledged: true, shift: 'early', acknowledgedAt: null }),
  'scan.resolve': () =>
    scene.isUnknownSerial
      ? { kind: 'unknownSerial', serial: 'HL2402001' }
      : { kind: 'instrument', serial: 'HL2401873', modelName: 'Linden concert' },
  'instruments.read': () => instrument,
  'runs.start': () => refuse(scene.startRefusal ?? 'bench.offline', 409, HOLDER),
  'runs.read': () => scene.view ?? refuse('run.unknown', 404),
  'runs.trace': () => (scene.view ? traceOf(scene.view) : refuse('run.unknown', 404)),
  'runs.act': () => scene.view,
  'runs.takeOver': () => scene.view,
  'runs.recompute': () => ({
    run: IDS.run,
    serial: 'HL2401873',
    sameVerdict: true,
    sameBits: true,
    sameRuntime: true,
    largestDifference: 0,
    differences: [],
  }),
  'benches.simulate': () => ({}),
}

export function api(key: RouteKey): Promise<unknown> {
  return Promise.resolve().then(() => {
    if (scene.isOffline && key !== 'auth.me' && key !== 'benches.list') throw new ApiProblem('client.offline')
    const answer = ANSWERS[key]
    if (!answer) throw new ApiProblem('client.answer')
    return answer()
  })
}

export const http = {
  api,
  ensureFresh: () => Promise.resolve(true),
  onSession: () => () => undefined,
}
