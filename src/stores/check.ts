import { defineStore } from 'pinia'
import { computed, reactive, ref, shallowRef } from 'vue'
import { z } from 'zod'
import { ApiProblem, isAbort, toApiProblem } from '../api/apiProblem.ts'
import { api } from '../api/http.ts'
import { newId } from '../api/newId.ts'
import { ERRORS } from '../shared/contract/errors.ts'
import { Serial } from '../shared/contract/runs.ts'
import type { RunConditions, RunReason, RunView } from '../shared/contract/runs.ts'
import type { Cautions, InstrumentView, ModelView } from '../shared/contract/workshop.ts'
import { keep, readKept } from './storage.ts'
import { useWorkshopStore } from './workshop.ts'

/** Room climate drifts within a shift: what was typed longer ago is asked for again. */
const CLIMATE_LASTS_MS = 8 * 3600 * 1000

const KeptConditions = z.object({
  stringSet: z.string().max(60),
  humidityPercent: z.number().nullable(),
  temperatureC: z.number().nullable(),
  excitation: z.enum(['hand', 'wire', 'mechanical']),
  mute: z.enum(['felt', 'hand']),
  climateAt: z.number(),
})

/** What the bench remembers from check to check; what belongs to one instrument starts empty. */
function rememberedConditions(now: number): RunConditions {
  const kept = readKept('conditions', KeptConditions)
  const isFresh = kept !== null && now - kept.climateAt < CLIMATE_LASTS_MS
  return {
    stringSet: kept?.stringSet ?? '',
    strungMinutes: null,
    tunedToPitch: false,
    humidityPercent: isFresh ? kept.humidityPercent : null,
    temperatureC: isFresh ? kept.temperatureC : null,
    controlsSet: false,
    excitation: kept?.excitation ?? 'hand',
    mute: kept?.mute ?? 'felt',
  }
}

export type StartPhase = 'idle' | 'looking' | 'ready' | 'problem'

/** Everything before a run is open: the serial, its model, reason, conditions, cautions, the start itself. */
export const useCheckStore = defineStore('check', () => {
  const workshop = useWorkshopStore()
  const serial = ref<string | null>(null)
  const phase = ref<StartPhase>('idle')
  const instrument = shallowRef<InstrumentView | null>(null)
  const problem = shallowRef<ApiProblem | null>(null)
  const cautions = shallowRef<Cautions | null>(null)
  const isStarting = ref(false)
  const startProblem = shallowRef<ApiProblem | null>(null)
  const modelId = ref<string | null>(readKept('model', z.string()))
  const reason = ref<RunReason>('new')
  const conditions = reactive<RunConditions>(rememberedConditions(Date.now()))
  let looking: AbortController | null = null
  let startId = newId()

  const isNewSerial = computed(() => phase.value === 'ready' && instrument.value === null)
  const model = computed<ModelView | null>(() => {
    const id = instrument.value?.model.id ?? modelId.value
    return workshop.models.find((one) => one.id === id) ?? null
  })

  /** Finds out what the serial belongs to. An unknown one is ready too: it only needs its model. */
  async function look(code: string): Promise<void> {
    looking?.abort()
    const mine = new AbortController()
    looking = mine
    serial.value = code
    instrument.value = null
    problem.value = null
    startProblem.value = null
    startId = newId()
    phase.value = 'looking'
    if (!Serial.safeParse(code).success) {
      problem.value = new ApiProblem({
        type: '',
        code: 'serial.invalid',
        status: 400,
        ...ERRORS['serial.invalid'],
      })
      phase.value = 'problem'
      return
    }
    try {
      const [found] = await Promise.all([
        readInstrument(code, mine.signal),
        workshop.loadModels(),
        workshop.benchesKnown ? null : workshop.loadBenches(),
        readCautions(),
      ])
      if (looking !== mine) return
      instrument.value = found
      reason.value = found && found.runs.length > 0 ? 'retest' : 'new'
      Object.assign(conditions, rememberedConditions(Date.now()))
      phase.value = 'ready'
    } catch (cause) {
      if (looking !== mine || isAbort(cause)) return
      problem.value = toApiProblem(cause)
      phase.value = 'problem'
    }
  }

  /** null: no instrument has this serial yet */
  async function readInstrument(code: string, signal: AbortSignal): Promise<InstrumentView | null> {
    const target = await api('scan.resolve', { params: { code } }, { signal })
    if (target.kind === 'unknownSerial') return null
    return api('instruments.read', { params: { serial: code } }, { signal })
  }

  async function readCautions(): Promise<void> {
    cautions.value = await api('cautions.read')
  }

  async function acknowledgeCautions(): Promise<void> {
    try {
      cautions.value = await api('cautions.acknowledge', { body: { id: newId() } })
      startProblem.value = null
    } catch (cause) {
      startProblem.value = toApiProblem(cause)
    }
  }

  /** Opens the run. The id stays the same until it is known whether it was opened, so that a retry opens one run. */
  async function start(): Promise<RunView | null> {
    const benchId = workshop.benchId
    if (isStarting.value || serial.value === null || benchId === null) return null
    isStarting.value = true
    startProblem.value = null
    try {
      const view = await api('runs.start', {
        body: {
          id: startId,
          serial: serial.value,
          modelId: instrument.value ? null : modelId.value,
          benchId,
          reason: reason.value,
          conditions: { ...conditions },
        },
      })
      rememberChoices()
      return view
    } catch (cause) {
      startProblem.value = toApiProblem(cause)
      if (startProblem.value.code === 'cautions.needed') cautions.value = await readCautionsOrNull()
      return null
    } finally {
      isStarting.value = false
    }
  }

  async function readCautionsOrNull(): Promise<Cautions | null> {
    try {
      return await api('cautions.read')
    } catch (cause) {
      startProblem.value = toApiProblem(cause)
      return cautions.value
    }
  }

  /** Goes on with a run that is open already: its opener or a lead. */
  async function takeOver(runId: string, why: string): Promise<RunView | null> {
    isStarting.value = true
    try {
      const view = await api('runs.takeOver', { params: { id: runId }, body: { id: newId(), reason: why } })
      startProblem.value = null
      return view
    } catch (cause) {
      startProblem.value = toApiProblem(cause)
      return null
    } finally {
      isStarting.value = false
    }
  }

  function rememberChoices(): void {
    const { stringSet, humidityPercent, temperatureC, excitation, mute } = conditions
    const before = readKept('conditions', KeptConditions)
    const isSameClimate =
      before !== null && before.humidityPercent === humidityPercent && before.temperatureC === temperatureC
    const climateAt = isSameClimate ? before.climateAt : Date.now()
    keep('conditions', { stringSet, humidityPercent, temperatureC, excitation, mute, climateAt })
    if (modelId.value) keep('model', modelId.value)
  }

  /** Back to an empty bench, ready for the next scan. */
  function clear(): void {
    looking?.abort()
    looking = null
    serial.value = null
    instrument.value = null
    problem.value = null
    startProblem.value = null
    phase.value = 'idle'
    startId = newId()
  }

  return {
    serial,
    phase,
    instrument,
    problem,
    cautions,
    isStarting,
    startProblem,
    modelId,
    reason,
    conditions,
    isNewSerial,
    model,
    look,
    acknowledgeCautions,
    start,
    takeOver,
    clear,
  }
})
