import { isDeepStrictEqual } from 'node:util'
import type { BenchHello } from '../../src/shared/contract/frames.ts'
import type { RunSetup } from '../../src/shared/contract/runs.ts'

/** What a bench measures with: a verification is of this, and no longer holds when it is another. */
export type VerifiedSetup = Pick<BenchHello, 'channelKind' | 'capabilities' | 'algorithms'>

export function channelsOfKind(kind: BenchHello['channelKind']): number {
  return kind === 'six' ? 6 : 1
}

/** Whether what was verified covers what the bench says of itself today. */
export function isCovered(verified: VerifiedSetup, hello: VerifiedSetup): boolean {
  return (
    verified.channelKind === hello.channelKind &&
    hello.capabilities.every((capability) => verified.capabilities.includes(capability)) &&
    isDeepStrictEqual(verified.algorithms, hello.algorithms)
  )
}

/** Names of what a bench says otherwise than when its run began; it may say that it can do more. */
export function differencesOf(
  hello: BenchHello,
  setup: Pick<RunSetup, 'channelKind' | 'capabilities' | 'algorithms' | 'frameMs' | 'mainsHz'>,
): string[] {
  const differs = {
    channelKind: hello.channelKind !== setup.channelKind,
    frameMs: hello.frameMs !== setup.frameMs,
    mainsHz: hello.mainsHz !== setup.mainsHz,
    capabilities: !setup.capabilities.every((capability) => hello.capabilities.includes(capability)),
    algorithms: !isDeepStrictEqual(hello.algorithms, setup.algorithms),
  }
  return Object.entries(differs).flatMap(([name, isOther]) => (isOther ? [name] : []))
}
