import { afterEach, beforeEach, describe, expect, it } from 'vitest'
import { createBenchClient } from '../../../simulator/bench/benchClient.ts'
import type { BenchClient, BenchClientOptions } from '../../../simulator/bench/benchClient.ts'
import { makeModelledSource } from '../../../simulator/sources/modelledSource.ts'
import type { BenchSource } from '../../../simulator/sources/source.ts'
import type { SimulationCommand } from '../../../src/shared/contract/simulation.ts'
import { makeArrivals } from '../../helpers/arrivals.ts'
import type { Arrivals } from '../../helpers/arrivals.ts'
import { buildOrder, makeCountingSource } from '../../helpers/countingSource.ts'
import { helloAnswer, problem, startFakeBenchServer } from '../../helpers/fakeBenchServer.ts'
import type { FakeBenchServer } from '../../helpers/fakeBenchServer.ts'
import { makeHandClock } from '../../helpers/handClock.ts'
import type { HandClock } from '../../helpers/handClock.ts'

const TOKEN = 'a-token-that-only-this-test-knows-123'
const HOUR_MS = 3_600_000

let server: FakeBenchServer
let clock: HandClock
let lines: Arrivals<string>
let client: BenchClient

beforeEach(async () => {
  server = await startFakeBenchServer()
  clock = makeHandClock()
  lines = makeArrivals()
})

afterEach(async () => {
  client.stop()
  await server.close()
})

function startClient(source: BenchSource, more: Partial<BenchClientOptions> = {}): void {
  client = createBenchClient({
    url: server.url,
    token: TOKEN,
    source,
    clock,
    log: (line) => {
      lines.push(line)
    },
    jitter: () => 1,
    backoffMs: { first: 100, most: 1000 },
    ...more,
  })
  client.start()
}

const connected = (): Promise<string> => lines.takeUntil((line) => line.startsWith('Connected'))

/** The client has heard everything that the server sent up to now. */
async function heard(): Promise<void> {
  server.socket().emit('bench:refused', problem('protocol.unknown-event'))
  await lines.takeUntil((line) => line.includes('protocol.unknown-event'))
}

/** A client in the middle of a run, with its first batch taken. */
async function startRun(source = makeCountingSource(), more: Partial<BenchClientOptions> = {}) {
  server.answerHello = () => helloAnswer({ order: buildOrder() })
  startClient(source, more)
  await connected()
  clock.advance(50)
  const first = await server.batches.take()
  return { source, first }
}

const numbersOf = (arrived: { batch: { frames: { currentUa: number | null }[] } }): (number | null)[] =>
  arrived.batch.frames.map((frame) => frame.currentUa)

describe('hello', () => {
  it('says what the source is, with the token in the handshake and never in the address', async () => {
    startClient(makeModelledSource({ seed: 1, channelKind: 'six', circuit: 'buffered' }))
    const connection = await server.connections.take()
    expect(connection.auth).toEqual({ token: TOKEN })
    expect(connection.address).not.toContain(TOKEN)
    const hello = await server.hellos.take()
    expect(hello).toMatchObject({ channelKind: 'six', frameMs: 10, mainsHz: 50, holding: null })
    expect(hello.capabilities).toContain('contactResistance')
  })

  it('verifies itself against the check standard when the server asks for it', async () => {
    server.answerHello = () => helloAnswer({ verified: false })
    startClient(makeModelledSource({ seed: 1, channelKind: 'six', circuit: 'buffered' }))
    const verify = await server.verifies.take()
    expect(new Set(verify.tones.map((tone) => tone.channel))).toEqual(new Set([0, 1, 2, 3, 4, 5, 6]))
    for (const tone of verify.tones) {
      expect(Math.abs(tone.measuredMdb - tone.appliedMdb)).toBeLessThan(200)
    }
    expect(verify.resistances.map((each) => each.appliedMicroOhm)).toEqual([0, 100_000, 1_000_000, null])
  })

  it('does not verify again while it is verified, and renews before it runs out', async () => {
    server.answerHello = () => helloAnswer({ verifiedUntil: '2026-12-01T10:00:00.000Z' })
    startClient(makeModelledSource({ seed: 1, channelKind: 'one', circuit: 'buffered' }))
    await connected()
    clock.advance(0.9 * HOUR_MS)
    await heard()
    expect(server.verifies.count()).toBe(0)
    clock.advance(0.2 * HOUR_MS)
    expect((await server.verifies.take()).tones).toHaveLength(2)
  })
})

describe('frames', () => {
  it('go out each 50 ms, one batch in flight', async () => {
    const { first } = await startRun()
    expect(numbersOf(first)).toEqual([0, 1, 2, 3, 4])
    clock.advance(50)
    clock.advance(50)
    clock.advance(50)
    first.accept()
    const second = await server.batches.take()
    expect(server.batches.count()).toBe(0)
    expect(numbersOf(second)).toEqual([5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15, 16, 17, 18, 19])
  })

  it('keep to the window that the answer sets', async () => {
    const { first } = await startRun()
    clock.advance(500)
    first.accept({ window: 7 })
    const second = await server.batches.take()
    expect(numbersOf(second)).toEqual([5, 6, 7, 8, 9, 10, 11])
  })

  it('are sent again when the server wants an earlier one', async () => {
    const { first } = await startRun()
    first.answer({ ok: true, next: 2, committed: 0, window: 200 })
    const second = await server.batches.take()
    expect(second.batch.from).toBe(2)
    expect(numbersOf(second).slice(0, 3)).toEqual([2, 3, 4])
  })

  it('are sent from the frame that a gap names', async () => {
    const { first } = await startRun()
    first.accept()
    clock.advance(50)
    const second = await server.batches.take()
    second.answer({ ok: false, problem: problem('frames.gap', { next: 3 }) })
    const third = await server.batches.take()
    expect(third.batch.from).toBe(3)
    expect(client.refusals().get('frames.gap')).toBe(1)
  })

  it('come again unchanged after an answer was lost', async () => {
    const { first } = await startRun(makeCountingSource(), { answerTimeoutMs: 30 })
    await lines.takeUntil((line) => line.startsWith('No answer'))
    const again = await server.batches.take()
    expect(again.batch.from).toBe(0)
    expect(again.batch.frames.slice(0, 5)).toEqual(first.batch.frames)
  })

  it('wait a second when the window is shut, then knock', async () => {
    const { first } = await startRun()
    first.accept({ window: 0 })
    await heard()
    clock.advance(950)
    await heard()
    expect(server.batches.count()).toBe(0)
    clock.advance(100)
    const knock = await server.batches.take()
    expect(knock.batch.frames).toHaveLength(1)
  })

  it('stop when the run takes no more, and are kept until its end is told', async () => {
    const { source, first } = await startRun()
    first.answer({ ok: false, problem: problem('run.not-open', { next: 5 }) })
    await lines.takeUntil((line) => line.includes('run.not-open'))
    clock.advance(1000)
    expect(server.batches.count()).toBe(0)
    expect(client.runId()).toBe(buildOrder().run)
    server.socket().emit('run:ended', { run: buildOrder().run, outcome: 'sealed', verdict: 'pass' })
    await lines.takeUntil((line) => line.includes('ended: sealed'))
    expect(client.runId()).toBeNull()
    expect(source.finished).toBe(1)
  })
})

describe('a run', () => {
  it('starts by order, takes the prompts, and a new one takes the place of the old', async () => {
    const source = makeCountingSource()
    startClient(source)
    await connected()
    server.socket().emit('run:start', buildOrder())
    server
      .socket()
      .emit('run:prompt', { run: buildOrder().run, phase: 'unplugged', prompt: 'plugIn', stringNo: null })
    await lines.takeUntil((line) => line.startsWith('Run '))
    clock.advance(50)
    ;(await server.batches.take()).accept()
    expect(source.prompts.map((prompt) => prompt.prompt)).toEqual(['plugIn'])
    const other = buildOrder({ run: 'c7c3f5de-2f0f-4d52-8a57-0a4b1c9d3e99' })
    server.socket().emit('run:start', other)
    await lines.takeUntil((line) => line.includes(other.run))
    clock.advance(50)
    const batch = await server.batches.takeUntil((arrived) => arrived.batch.run === other.run)
    expect(batch.batch.from).toBe(0)
    expect(source.finished).toBe(1)
  })

  it('takes a prompt that came before the order', async () => {
    const source = makeCountingSource()
    const order = buildOrder()
    server.answerHello = () => {
      server
        .socket()
        .emit('run:prompt', { run: order.run, phase: 'noise', prompt: 'muteAll', stringNo: null })
      return helloAnswer({ order })
    }
    startClient(source)
    await connected()
    await lines.takeUntil((line) => line.startsWith('Run '))
    expect(source.prompts.map((prompt) => prompt.prompt)).toEqual(['muteAll'])
  })
})

describe('reconnecting', () => {
  it('keeps measuring while the server is away, tells what it holds and sends what is not safe', async () => {
    const { source, first } = await startRun()
    await server.hellos.take()
    first.accept({ committed: 3 })
    clock.advance(50)
    ;(await server.batches.take()).accept({ committed: 3 })
    server.socket().disconnect(true)
    await lines.takeUntil((line) => line.startsWith('The connection ended'))
    expect(source.seen.at(-1)).toBe(false)
    server.answerHello = () => helloAnswer({ order: buildOrder({ from: 3 }) })
    clock.advance(1000)
    const hello = await server.hellos.take()
    expect(hello.holding).toEqual({ run: buildOrder().run, from: 3 })
    const resent = await server.batches.take()
    expect(resent.batch.from).toBe(3)
    expect(numbersOf(resent).slice(0, 8)).toEqual([3, 4, 5, 6, 7, 8, 9, 10])
    expect(resent.batch.frames.length).toBeGreaterThan(100)
    expect(resent.batch.events).toEqual([])
    expect(source.starts).toHaveLength(1)
  })

  it('keeps what it holds of a run while the server has no order for it, until its end is told', async () => {
    const { source, first } = await startRun()
    await server.hellos.take()
    first.accept()
    server.socket().disconnect(true)
    await lines.takeUntil((line) => line.startsWith('The connection ended'))
    server.answerHello = () => helloAnswer()
    clock.advance(1000)
    await connected()
    expect((await server.hellos.take()).holding).toEqual({ run: buildOrder().run, from: 0 })
    clock.advance(50)
    ;(await server.batches.take()).answer({ ok: false, problem: problem('run.not-open') })
    await lines.takeUntil((line) => line.includes('run.not-open'))
    server.socket().disconnect(true)
    await lines.takeUntil((line) => line.startsWith('The connection ended'))
    server.answerHello = () => helloAnswer({ order: buildOrder() })
    clock.advance(1000)
    const again = await server.batches.take()
    expect(again.batch.from).toBe(0)
    expect(again.batch.events).toEqual([])
    expect(source.starts).toHaveLength(1)
    server.socket().emit('run:ended', { run: buildOrder().run, outcome: 'sealed', verdict: 'pass' })
    await lines.takeUntil((line) => line.includes('ended: sealed'))
    expect(client.runId()).toBeNull()
    expect(source.finished).toBe(1)
  })

  it('marks the break after the bench itself was restarted', async () => {
    server.answerHello = () => helloAnswer({ order: buildOrder({ from: 250 }) })
    startClient(makeCountingSource())
    await connected()
    clock.advance(50)
    const { batch } = await server.batches.take()
    expect(batch.from).toBe(250)
    expect(batch.events.map((event) => [event.kind, event.frame])).toEqual([['discontinuity', 250]])
  })

  it('stays away after a newer connection took over, however long', async () => {
    let told = 0
    startClient(makeCountingSource(), {
      onReplaced: () => {
        told += 1
      },
    })
    await connected()
    await server.connections.take()
    server.socket().emit('bench:replaced', problem('bench.replaced'))
    await lines.takeUntil((line) => line.includes('bench.replaced'))
    expect(client.state()).toBe('replaced')
    clock.advance(HOUR_MS)
    expect(client.state()).toBe('replaced')
    expect(server.connections.count()).toBe(0)
    expect(told).toBe(1)
  })

  it('tries a refused token again, but seldom', async () => {
    server.refuseWith = 'bench.token'
    startClient(makeCountingSource())
    await lines.takeUntil((line) => line.includes('bench.token'))
    server.refuseWith = null
    clock.advance(29_000)
    expect(client.state()).toBe('waiting')
    clock.advance(1_000)
    await connected()
    expect(client.refusals().get('bench.token')).toBe(1)
  })

  it('waits longer after each failure, up to a limit', async () => {
    server.refuseWith = 'storage.away'
    startClient(makeCountingSource())
    for (const waitMs of [100, 200, 400, 800, 1000, 1000]) {
      await lines.takeUntil((line) => line.includes('storage.away'))
      clock.advance(waitMs - 1)
      expect(client.state()).toBe('waiting')
      clock.advance(1)
      expect(client.state()).toBe('connecting')
    }
  })
})

describe('messages that are not right', () => {
  it('change nothing', async () => {
    const source = makeCountingSource()
    startClient(source)
    await connected()
    const raw = server.socket() as unknown as { emit: (event: string, ...args: unknown[]) => void }
    raw.emit('run:start', { run: 'not an id' })
    raw.emit('run:start', null)
    raw.emit('run:prompt', 17)
    raw.emit('run:prompt')
    raw.emit('nobody:knows', {})
    server.socket().emit('run:start', buildOrder())
    await lines.takeUntil((line) => line.startsWith('Run '))
    expect(source.starts).toHaveLength(1)
    expect(source.prompts).toEqual([])
  })
})

describe('bench:simulate', () => {
  it('is refused by a bench that is not simulated', async () => {
    startClient(makeCountingSource())
    await connected()
    const answer = await server.socket().emitWithAck('bench:simulate', { kind: 'plug' })
    expect(answer).toMatchObject({ ok: false, problem: { code: 'bench.not-simulated' } })
  })

  it('is done by a modelled instrument, and refused when it makes no sense', async () => {
    const source = makeModelledSource({ seed: 1, channelKind: 'one', circuit: 'buffered' })
    startClient(source)
    await connected()
    const place: SimulationCommand = { kind: 'place', seed: 77, faults: [], scatterDb: 1 }
    expect(await server.socket().emitWithAck('bench:simulate', place)).toEqual({ ok: true })
    expect(source.parts.seed).toBe(77)
    const raw = server.socket() as unknown as {
      emitWithAck: (event: string, message: unknown) => Promise<unknown>
    }
    expect(await raw.emitWithAck('bench:simulate', { kind: 'pluck', stringNo: 9 })).toMatchObject({
      ok: false,
      problem: { code: 'protocol.message' },
    })
  })
})
