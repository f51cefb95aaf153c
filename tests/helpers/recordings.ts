import path from 'node:path'
import type { BenchEvent, Frame, RunOrder } from '../../src/shared/contract/frames.ts'
import { proofRecordings } from '../../simulator/recordings/proofRecordings.ts'
import type { ProofRecordings } from '../../simulator/recordings/proofRecordings.ts'
import { OPEN_STRINGS_HZ } from '../../simulator/recordings/soxPlucks.ts'
import type { BenchSource } from '../../simulator/sources/source.ts'
import { projectDir } from './sources.ts'

/** Recordings made by sox, kept from one test run to the next: sox always makes the same. */
export function recordings(): ProofRecordings {
  return proofRecordings(path.join(projectDir, 'node_modules/.cache/recordings'))
}

export const RECORDING_ORDER: RunOrder = {
  run: '5f0f3c1e-2f37-4c40-8a41-0c6f1b7ad001',
  serial: 'HL2401873',
  from: 0,
  window: 200,
  noiseStretchMs: 2000,
  expectedHz: OPEN_STRINGS_HZ.map((hz) => [hz]),
}

export interface Played {
  frames: Frame[]
  events: BenchEvent[]
}

/** Everything that a source gives in one run, from its first frame to its end. */
export function playAll(source: BenchSource, order: RunOrder = RECORDING_ORDER): Played {
  source.start(order)
  const played: Played = { frames: [], events: [] }
  for (;;) {
    const step = source.next(played.frames.length)
    if (step === 'ended') return played
    if (step === 'notYet') throw new Error('a recording always has its next frame')
    played.frames.push(step.frame)
    played.events.push(...step.events)
  }
}
