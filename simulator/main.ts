import { OptionError, readBenchOptions, USAGE } from './benchOptions.ts'
import type { BenchOptions } from './benchOptions.ts'
import { createBenchClient } from './bench/benchClient.ts'
import { RecordingError } from './signal/recordingError.ts'
import { makeModelledSource } from './sources/modelledSource.ts'
import { PcmSource } from './sources/pcmSource.ts'
import type { BenchSource } from './sources/source.ts'
import { WavSource } from './sources/wavSource.ts'

const USAGE_EXIT = 2

function sourceOf(options: BenchOptions): BenchSource {
  const { frameMs, mainsHz, offsetDb } = options
  const recorded = {
    frameMs,
    mainsHz,
    offsetDb,
    ...(options.useChannels === null ? {} : { useChannels: options.useChannels }),
    ...(options.realTime === null ? {} : { realTime: options.realTime }),
  }
  if (options.source === 'wav') return new WavSource(options.file!, recorded)
  if (options.source === 'pcm') {
    const { rateHz, coding, channels } = options
    return new PcmSource(process.stdin, { ...recorded, rateHz, coding, channels })
  }
  const { seed, channelKind, circuit, hand, speed } = options
  return makeModelledSource({ seed, channelKind, circuit, hand, timeScale: speed, frameMs, mainsHz })
}

function say(line: string): void {
  process.stdout.write(`${line}\n`)
}

function main(): void {
  const args = process.argv.slice(2)
  if (args.includes('--help')) {
    say(USAGE)
    return
  }
  const options = readBenchOptions(args, process.env)
  const source = sourceOf(options)
  const client = createBenchClient({
    url: options.url,
    token: options.token,
    source,
    log: (line) => {
      say(`bench ${options.bench}: ${line}`)
    },
    onReplaced: () => {
      // it stays as an idle process, so that whoever keeps benches running does not start the fight again
      say(`bench ${options.bench}: gives way and stays away. End this program.`)
      idle = setInterval(() => undefined, 2 ** 30)
    },
  })
  let idle: NodeJS.Timeout | undefined
  const end = (): void => {
    client.stop()
    clearInterval(idle)
    void source.close?.()
    process.stdin.destroy()
  }
  process.once('SIGINT', end)
  process.once('SIGTERM', end)
  client.start()
}

try {
  main()
} catch (error) {
  if (!(error instanceof OptionError || error instanceof RecordingError)) throw error
  process.stderr.write(`${error.message}\n`)
  process.exitCode = USAGE_EXIT
}
