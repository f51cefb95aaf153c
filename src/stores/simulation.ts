import { defineStore } from 'pinia'
import { reactive, ref, shallowRef, watch } from 'vue'
import { z } from 'zod'
import { toApiProblem, type ApiProblem } from '../api/apiProblem.ts'
import { api } from '../api/http.ts'
import type { FaultId, SimulationCommand } from '../shared/contract/simulation.ts'
import { keep, readKept } from './storage.ts'

const HandStates = z.record(z.string(), z.boolean())

interface Placed {
  fault: FaultId | 'none'
  /** for a fault that sits under one string */
  stringNo: number
  severity: number
  seed: number
  scatterDb: number
}

/**
 * What lies on a simulated bench and how its hand was last set from here: it outlasts the step from the start to the
 * run, and the hand's state a reload too. No bench tells its hand's state, so what was not set from here is not known.
 */
export const useSimulationStore = defineStore('simulation', () => {
  const placed = reactive<Placed>({
    fault: 'none',
    stringNo: 4,
    severity: 1,
    seed: 1,
    scatterDb: 0.8,
  })
  const speed = ref(1)
  const hands = ref<Readonly<Record<string, boolean>>>(readKept('hands', HandStates, 'tab') ?? {})
  watch(hands, (now) => keep('hands', now, 'tab'))
  const isOpen = ref(false)
  const isSending = ref(false)
  const done = ref('')
  const problem = shallowRef<ApiProblem | null>(null)

  /** null: not known */
  const isHandOn = (benchId: string): boolean | null => hands.value[benchId] ?? null

  /** A bench that was away may be another program now. */
  function forgetHand(benchId: string): void {
    hands.value = Object.fromEntries(Object.entries(hands.value).filter(([id]) => id !== benchId))
  }

  async function send(benchId: string, command: SimulationCommand, said: string): Promise<void> {
    isSending.value = true
    problem.value = null
    try {
      await api('benches.simulate', { params: { id: benchId }, body: command })
      done.value = said
      if (command.kind === 'automaticHand') {
        hands.value = { ...hands.value, [benchId]: command.on }
      }
    } catch (cause) {
      problem.value = toApiProblem(cause)
      done.value = ''
    } finally {
      isSending.value = false
    }
  }

  return { placed, speed, isOpen, isSending, done, problem, isHandOn, forgetHand, send }
})
