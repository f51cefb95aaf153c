import { defineStore } from 'pinia'
import { reactive, ref, shallowRef } from 'vue'
import { toApiProblem, type ApiProblem } from '../api/apiProblem.ts'
import { api } from '../api/http.ts'
import type { FaultId, SimulationCommand } from '../shared/contract/simulation.ts'

interface Placed {
  fault: FaultId | 'none'
  /** for a fault that sits under one string */
  stringNo: number
  severity: number
  seed: number
  scatterDb: number
}

/** What lies on a simulated bench and whether its hand is on: it outlasts the step from the start to the run. */
export const useSimulationStore = defineStore('simulation', () => {
  const placed = reactive<Placed>({
    fault: 'none',
    stringNo: 4,
    severity: 1,
    seed: 1,
    scatterDb: 0.8,
  })
  const speed = ref(1)
  const handOn = ref<readonly string[]>([])
  const isOpen = ref(false)
  const isSending = ref(false)
  const done = ref('')
  const problem = shallowRef<ApiProblem | null>(null)

  const isHandOn = (benchId: string) => handOn.value.includes(benchId)

  async function send(benchId: string, command: SimulationCommand, said: string): Promise<void> {
    isSending.value = true
    problem.value = null
    try {
      await api('benches.simulate', { params: { id: benchId }, body: command })
      done.value = said
      if (command.kind === 'automaticHand') {
        const others = handOn.value.filter((id) => id !== benchId)
        handOn.value = command.on ? [...others, benchId] : others
      }
    } catch (cause) {
      problem.value = toApiProblem(cause)
      done.value = ''
    } finally {
      isSending.value = false
    }
  }

  return { placed, speed, isOpen, isSending, done, problem, isHandOn, send }
})
