import {
  NO_VALUE,
  formatCount,
  formatMa,
  formatMohm,
  formatMs,
  formatOhm,
  formatReading,
  formatShare,
  formatUa,
  formatVolt,
  type LevelUnit,
} from '../../format.ts'
import type { MeasuredRun } from '../../shared/contract/measured.ts'
import type { RuleId } from '../../shared/contract/rules.ts'
import type { ReadingRow } from './ReadingList.vue'

function isOutside(measured: MeasuredRun, ...rules: RuleId[]): boolean {
  return measured.results.some((r) => r.result === 'outside' && rules.includes(r.rule))
}

/** At the bench the A-weighted floor, hum and S/N; `all` adds the broadband floor. */
export function noiseRows(measured: MeasuredRun, level: LevelUnit, all: boolean): ReadingRow[] {
  const { noise, snA, snFlat } = measured
  const sn =
    snA.value !== null || snFlat.value === null
      ? { name: 'S/N A, worst', value: formatReading(snA), isOutside: isOutside(measured, 'snA') }
      : { name: 'S/N, worst', value: formatReading(snFlat), isOutside: isOutside(measured, 'snFlat') }
  const flat = {
    name: 'broadband',
    value: formatReading(noise.flat, { level }),
    isOutside: isOutside(measured, 'noiseFlat'),
  }
  return [
    {
      name: 'A-weighted',
      value: formatReading(noise.a, { level }),
      isOutside: isOutside(measured, 'noiseA'),
    },
    ...(all || flat.isOutside || noise.a.value === null ? [flat] : []),
    {
      name: `hum ${noise.mainsHz} Hz`,
      value: formatReading(noise.hum, { level }),
      isOutside: isOutside(measured, 'hum'),
    },
    sn,
  ]
}

const word = (state: boolean | null, yes: string, no: string) =>
  state === null ? NO_VALUE : state ? yes : no

export function jackRows(measured: MeasuredRun): ReadingRow[] {
  const { jack } = measured
  const rows: ReadingRow[] = [
    {
      name: 'unplugged',
      value: word(jack.unpluggedOpen, 'open', 'closed'),
      isOutside: jack.unpluggedOpen === false,
    },
    {
      name: 'ring\u2013sleeve',
      value: word(jack.pluggedClosed, 'closed', 'open'),
      isOutside: jack.pluggedClosed === false,
    },
    {
      name: 'tip signal',
      value: word(jack.tipSteady, 'steady', 'breaks'),
      isOutside: jack.tipSteady === false,
    },
    {
      name: 'wiggle',
      value: wiggleText(measured),
      isOutside: isOutside(measured, 'disturbanceCount', 'disturbanceLongest'),
    },
  ]
  const contacts = [
    ['tip', jack.contactTipOhm, 'contactTip'],
    ['ring', jack.contactRingOhm, 'contactRing'],
    ['sleeve', jack.contactSleeveOhm, 'contactSleeve'],
  ] as const
  for (const [pole, ohm, rule] of contacts) {
    if (ohm !== null)
      rows.push({ name: `${pole} contact`, value: formatOhm(ohm), isOutside: isOutside(measured, rule) })
  }
  if (jack.insulationMohm !== null) {
    rows.push({
      name: 'insulation',
      value: formatMohm(jack.insulationMohm),
      isOutside: isOutside(measured, 'insulation'),
    })
  }
  return rows
}

function wiggleText({ jack, phase }: MeasuredRun): string {
  if (phase === 'wiggle') return formatShare(jack.wiggleProgress)
  if (jack.wiggleProgress < 1 || jack.disturbanceCount === null) return 'not yet'
  if (jack.disturbanceCount === 0) return 'no breaks'
  const breaks = `${formatCount(jack.disturbanceCount)} ${jack.disturbanceCount === 1 ? 'break' : 'breaks'}`
  return jack.disturbanceLongestMs === null ? breaks : `${breaks}, ${formatMs(jack.disturbanceLongestMs)}`
}

export function supplyRows(measured: MeasuredRun): ReadingRow[] {
  const { supply } = measured
  return [
    { name: 'plugged', value: formatMa(supply.pluggedMa), isOutside: isOutside(measured, 'currentPlugged') },
    {
      name: 'unplugged',
      value: formatUa(supply.unpluggedUa),
      isOutside: isOutside(measured, 'currentUnplugged'),
    },
    { name: 'battery', value: formatVolt(supply.batteryV), isOutside: isOutside(measured, 'battery') },
  ]
}
