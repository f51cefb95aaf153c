import type { SimulationCommand } from '../../src/shared/contract/simulation.ts'

/** What the screens' side needs of the benches that are connected now. */
export interface BenchConnections {
  isConnected: (benchId: string) => boolean
  /** Hands the command to a simulated bench; refuses with 'bench.offline' when it does not answer. */
  simulate: (benchId: string, command: SimulationCommand) => Promise<void>
}
