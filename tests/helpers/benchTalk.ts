import { randomUUID } from 'node:crypto'
import type {
  BenchHello,
  Frame,
  FrameBatch,
  FramesAnswer,
  HelloAnswer,
} from '../../src/shared/contract/frames.ts'
import type { RunConditions, RunStart } from '../../src/shared/contract/runs.ts'
import { demoId } from '../../db/seeds/demo.ts'
import type { BenchClient } from './runningServer.ts'

export function helloOf(more: Partial<BenchHello> = {}): BenchHello {
  return {
    protocolVersion: 1,
    channelKind: 'six',
    frameMs: 10,
    mainsHz: 50,
    capabilities: ['sixLevels', 'noiseA', 'hum', 'pitch'],
    algorithms: { test: '1' },
    wallClock: '2026-12-01T08:00:00.000Z',
    holding: null,
    ...more,
  }
}

export function quietFrame(channels = 6): Frame {
  return {
    levelMdb: new Array<number>(channels).fill(-90_000),
    levelAMdb: new Array<number>(channels).fill(-93_000),
    jackMdb: -88_000,
    jackAMdb: -91_000,
    clipped: 0,
    plugged: true,
    ringSleeveClosed: true,
    tipClosed: true,
    currentUa: 3000,
    batteryMv: 9000,
  }
}

export function batchOf(
  run: string,
  from: number,
  frames: number,
  more: Partial<FrameBatch> = {},
): FrameBatch {
  return { run, from, frames: Array.from({ length: frames }, () => quietFrame()), events: [], ...more }
}

export const CONDITIONS: RunConditions = {
  stringSet: 'light, bronze',
  strungMinutes: 60,
  tunedToPitch: true,
  humidityPercent: 48,
  temperatureC: 21,
  controlsSet: true,
  excitation: 'hand',
  mute: 'felt',
}

export function startOf(serial: string, more: Partial<RunStart> = {}): RunStart {
  return {
    id: randomUUID(),
    serial,
    modelId: demoId('model LC'),
    benchId: demoId('bench window'),
    reason: 'new',
    conditions: CONDITIONS,
    ...more,
  }
}

export function sayHello(socket: BenchClient, more: Partial<BenchHello> = {}): Promise<HelloAnswer> {
  return socket.emitWithAck('bench:hello', helloOf(more))
}

export function sendFrames(socket: BenchClient, batch: unknown): Promise<FramesAnswer> {
  return socket.emitWithAck('bench:frames', batch as FrameBatch)
}
