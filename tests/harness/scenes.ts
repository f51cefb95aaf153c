import type { ErrorCode } from '../../src/shared/contract/errors.ts'
import type { Person } from '../../src/shared/contract/auth.ts'
import { permissionsOf } from '../../src/shared/contract/permissions.ts'
import type { RunSummary, RunTrace, RunView } from '../../src/shared/contract/runs.ts'
import type { BenchView, InstrumentView, ModelView } from '../../src/shared/contract/workshop.ts'
import { IDS, aModel, aSetup, aSheet } from '../fixtures/runParts.ts'
import * as views from '../fixtures/runViews.ts'

export interface Scene {
  /** the address that the screen opens at, behind the harness's own */
  path: string
  view?: RunView
  bench?: Partial<BenchView>
  person?: Partial<Person>
  isUnknownSerial?: boolean
  cautionsRead?: boolean
  startRefusal?: ErrorCode
  isOffline?: boolean
  patternSet?: boolean
}

const live = (view: RunView, over: Partial<Scene> = {}): Scene => ({
  path: `/check/${view.serial}?run=${view.id}`,
  view,
  ...over,
})
const shelf = (view: RunView): Scene => ({ path: `/runs/${view.id}`, view })

function withoutContacts(view: RunView): RunView {
  const sheet = aSheet()
  const extra = (['contactTip', 'contactRing', 'insulation'] as const).map((rule) => ({
    rule,
    low: rule === 'insulation' ? 1 : null,
    high: rule === 'insulation' ? null : 0.1,
    onOutside: 'reject' as const,
    required: true,
  }))
  return { ...view, setup: aSetup({ sheet: { ...sheet, rules: [...sheet.rules, ...extra] } }) }
}

export const SCENES: Record<string, Scene> = {
  idle: { path: '/check' },
  start: { path: '/check/HL2401873' },
  startNew: {
    path: '/check/HL2402001',
    isUnknownSerial: true,
    bench: { verified: false },
    patternSet: false,
  },
  startBusy: { path: '/check/HL2401873', startRefusal: 'bench.busy' },
  startBusyLead: {
    path: '/check/HL2401873',
    startRefusal: 'run.serial-busy',
    person: { roles: ['lead'], name: 'Floor lead' },
  },
  cautions: { path: '/check/HL2401873', cautionsRead: false },
  offline: { path: '/check/HL2401873', isOffline: true },
  unplugged: live(views.liveAt('unplugged')),
  settle: live(views.liveAt('settle')),
  jackRest: live(views.liveAt('jackRest')),
  noise: live(views.liveAt('noise')),
  strings: live(views.liveAt('strings')),
  lowString: live(views.liveWithLowString()),
  wiggleReady: live(views.liveAt('wiggleReady')),
  wiggle: live(views.liveAt('wiggle')),
  entry: live(withoutContacts(views.liveAt('entry'))),
  leftHanded: live(views.leftHanded()),
  notStored: live(views.judgedNotStored()),
  benchSilent: live(views.benchSilent()),
  watching: live(views.liveAt('strings'), { person: { id: IDS.model, name: 'Quality desk', roles: ['qc'] } }),
  pass: live(views.sealedPass()),
  fail: live(views.sealedFail()),
  dead: live(views.sealedDeadString()),
  none: live(views.sealedNone()),
  stopped: live(views.stoppedRun()),
  runPass: shelf(views.sealedPass()),
  runFail: shelf(views.sealedFail()),
  runDead: shelf(views.sealedDeadString()),
  runNone: shelf(views.sealedNone()),
  runStopped: shelf(views.stoppedRun()),
  runLive: shelf(views.liveAt('strings')),
}

export const scene: Scene = SCENES[new URLSearchParams(location.search).get('scene') ?? 'idle']!

export const person: Person = {
  id: IDS.person,
  name: 'Bench hand',
  email: 'installer@harrowlane.test',
  roles: ['installer'],
  ...scene.person,
  permissions: permissionsOf(scene.person?.roles ?? ['installer']),
}

export const bench: BenchView = {
  id: IDS.bench,
  name: 'Window',
  code: 'HLBENCH1',
  enrolled: true,
  simulated: true,
  channelKind: 'six',
  capabilities: aSetup().capabilities,
  connected: true,
  verifiedAt: '2026-12-01T07:12:00.000Z',
  verifiedUntil: '2026-12-02T07:12:00.000Z',
  verified: true,
  openRun: null,
  ...scene.bench,
}

export const model: ModelView = {
  ...aModel(),
  sheetInForce: {
    id: IDS.sheet,
    label: 'LC-7',
    revision: 7,
    status: 'inForce',
    inForceFrom: '2026-11-02T08:00:00.000Z',
  },
  sheet: aSheet({
    ...(scene.patternSet === false ? { patternDb: null } : {}),
    rules: [
      ...aSheet().rules,
      { rule: 'contactTip', low: null, high: 0.1, onOutside: 'advise', required: false },
      { rule: 'channelSeparation', low: 6, high: null, onOutside: 'advise', required: false },
    ],
  }),
}

const summary = (view: RunView): RunSummary => ({
  id: view.id,
  serial: view.serial,
  modelName: view.setup.model.name,
  benchName: view.benchName,
  person: view.openedBy.name,
  reason: view.reason,
  status: view.status,
  verdict: view.measured.verdict,
  openedAt: view.openedAt,
  endedAt: view.endedAt,
  sheetLabel: view.setup.sheet.label,
  handedness: view.setup.model.handedness,
  balancesDb: view.measured.strings.map((s) => s.balance.value),
  balanceLowDb: -2.5,
  balanceHighDb: 2.5,
  failing: [],
})

export const instrument: InstrumentView = {
  instrument: {
    id: IDS.instrument,
    serial: 'HL2401873',
    modelId: IDS.model,
    modelName: 'Linden concert',
    createdAt: '2026-11-30T09:00:00.000Z',
    runs: 1,
    lastRunAt: '2026-11-30T09:31:00.000Z',
    lastVerdict: 'fail',
  },
  model: aModel(),
  runs: [summary(views.sealedFail())],
}

/** Level of every element at a time of the run, from the plucks of the view: decays on a noise floor. */
export function levelsAt(view: RunView, frame: number): number[] {
  return view.measured.strings.map((s) => {
    const floorDb = -101 + Math.sin(frame * 1.7 + s.stringNo * 2.1) * 1.2
    let power = 10 ** (floorDb / 10)
    for (const pluck of view.measured.plucks) {
      const since = (frame - pluck.onsetFrame) * view.setup.frameMs
      if (since < 0 || since > 1400) continue
      const own = pluck.stringNo === s.stringNo
      const db = (pluck.levelDb ?? -60) - (own ? 0 : 26) - since * (0.006 + s.stringNo * -0.0004)
      power += 10 ** (db / 10)
    }
    return Math.round(10 * Math.log10(power) * 1000)
  })
}

export function traceOf(view: RunView): RunTrace {
  const frames = view.measured.frames
  const framesPerPoint = Math.max(1, Math.ceil(frames / 3000))
  const points = Array.from({ length: Math.floor(frames / framesPerPoint) }, (_, i) =>
    levelsAt(view, i * framesPerPoint),
  )
  return {
    run: view.id,
    frameMs: view.setup.frameMs,
    frames,
    framesPerPoint,
    levelMdb: [0, 1, 2, 3, 4, 5].map((i) => points.map((point) => point[i]!)),
    jackMdb: points.map((point) => Math.max(...point)),
    segments: [0, 3000, 6000]
      .filter((from) => from < frames)
      .map((fromFrame, no) => ({
        no,
        fromFrame,
        frames: Math.min(3000, frames - fromFrame),
        sha256: '9f2c4a7be01d5583c6aa1e77b40d92f35e8871ab6cc04f19d2e35b7088a1c4f6',
        bytes: 43210 - no * 900,
      })),
  }
}
