import type { BenchHello } from '../../src/shared/contract/frames.ts'
import type { SimulationCommand } from '../../src/shared/contract/simulation.ts'

/** What the screens' side needs of the benches that are connected now. */
export interface BenchConnections {
  isConnected: (benchId: string) => boolean
  /** what a bench that is connected says of itself */
  helloOf: (benchId: string) => BenchHello | null
  /** Hands the command to a simulated bench; refuses with 'bench.offline' when it does not answer. */
  simulate: (benchId: string, command: SimulationCommand) => Promise<void>
}
