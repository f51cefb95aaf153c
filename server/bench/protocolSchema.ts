import { z } from 'zod'
import {
  BENCH_NAMESPACE,
  BenchHello,
  BenchVerify,
  FrameBatch,
  FramesAnswer,
  HelloAnswer,
  MAX_BATCH_FRAMES,
  PROTOCOL_VERSION,
  RunCommitted,
  RunEnded,
  RunOrder,
  RunPrompt,
  VerifyAnswer,
} from '../../src/shared/contract/frames.ts'
import { Problem } from '../../src/shared/contract/errors.ts'
import { SimulationCommand } from '../../src/shared/contract/simulation.ts'

/** The bench protocol as JSON Schema, generated from the schemas that the server parses with. */
export function protocolSchema(): Record<string, unknown> {
  const schema = (type: z.ZodType) => z.toJSONSchema(type, { io: 'input', unrepresentable: 'any' })
  return {
    $schema: 'https://json-schema.org/draft/2020-12/schema',
    title: 'Evenstrung bench protocol',
    protocolVersion: PROTOCOL_VERSION,
    namespace: BENCH_NAMESPACE,
    mostFramesInABatch: MAX_BATCH_FRAMES,
    fromBench: {
      'bench:hello': schema(BenchHello),
      'bench:frames': schema(FrameBatch),
      'bench:verify': schema(BenchVerify),
    },
    answers: {
      'bench:hello': schema(HelloAnswer),
      'bench:frames': schema(FramesAnswer),
      'bench:verify': schema(VerifyAnswer),
    },
    toBench: {
      'run:start': schema(RunOrder),
      'run:prompt': schema(RunPrompt),
      'run:committed': schema(RunCommitted),
      'run:ended': schema(RunEnded),
      'bench:simulate': schema(SimulationCommand),
      'bench:refused': schema(Problem),
      'bench:replaced': schema(Problem),
    },
  }
}
