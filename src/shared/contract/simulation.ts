import { z } from 'zod'
import { StringNo } from './quantities.ts'

/** Conditions that the modelled instrument can have; every one changes the signal as its physics says. */
export const FaultId = z.enum([
  'elementOpen',
  'elementShorted',
  'poorSeating',
  'endsTight',
  'hollowMiddle',
  'tiltedSaddle',
  'stripEndLump',
  'crossedLeads',
  'polarityFlipped',
  'inputLoading',
  'stripShorted',
  'noPower',
  'volumeDown',
  'lowBattery',
  'shieldOpen',
  'dimmerBuzz',
  'hissyPreamp',
  'crackle',
  'wornJack',
  'switchStuckClosed',
  'switchStuckOpen',
  'currentHigh',
  'tipOpen',
  'benchHum',
])
export type FaultId = z.infer<typeof FaultId>

export const FAULT_NAMES: Record<FaultId, string> = {
  elementOpen: 'one element open',
  elementShorted: 'one element shorted',
  poorSeating: 'one string seated badly',
  endsTight: 'saddle ends tight: outer strings weak',
  hollowMiddle: 'slot hollow: middle strings weak',
  tiltedSaddle: 'saddle tilted: slope across the strings',
  stripEndLump: 'lump at the strip end: string 1 weak',
  crossedLeads: 'two neighbouring leads crossed',
  polarityFlipped: 'one element with flipped polarity',
  inputLoading: 'input loads the elements: thin bass',
  stripShorted: 'strip shorted',
  noPower: 'preamp has no power',
  volumeDown: 'volume control not at the test setting',
  lowBattery: 'battery low',
  shieldOpen: 'shield open: mains hum',
  dimmerBuzz: 'buzz from a dimmer',
  hissyPreamp: 'hissy preamp',
  crackle: 'crackle at rest',
  wornJack: 'worn jack: drop-outs when wiggled',
  switchStuckClosed: 'jack switch stuck closed',
  switchStuckOpen: 'jack switch stuck open',
  currentHigh: 'supply current too high',
  tipOpen: 'tip contact open',
  benchHum: 'ground loop at the bench',
}

export const Fault = z.object({
  fault: FaultId,
  /** which string, where the fault has one */
  stringNo: StringNo.optional(),
  /** 0 = barely, 1 = plain, up to 3 = gross */
  severity: z.number().min(0).max(3).default(1),
})
export type Fault = z.infer<typeof Fault>

/** What the person at a simulated bench does; marked as simulated everywhere. */
export const SimulationCommand = z.discriminatedUnion('kind', [
  z.object({
    kind: z.literal('place'),
    seed: z.int().min(0).max(4_294_967_295),
    faults: z.array(Fault).max(6),
    scatterDb: z.number().min(0).max(6).default(0.8),
  }),
  z.object({ kind: z.literal('plug') }),
  z.object({ kind: z.literal('unplug') }),
  z.object({ kind: z.literal('damp') }),
  z.object({ kind: z.literal('pluck'), stringNo: StringNo }),
  z.object({ kind: z.literal('wiggle') }),
  z.object({ kind: z.literal('pedal') }),
  /** the automatic hand follows the prompts by itself, with a hand's scatter */
  z.object({
    kind: z.literal('automaticHand'),
    on: z.boolean(),
    speed: z.number().min(0.5).max(50).default(1),
  }),
])
export type SimulationCommand = z.infer<typeof SimulationCommand>
