import { ref, shallowRef } from 'vue'
import { useRoute, useRouter } from 'vue-router'
import type { RouteLocationRaw } from 'vue-router'
import { toApiProblem } from '../api/apiProblem.ts'
import type { ApiProblem } from '../api/apiProblem.ts'
import type { ScanTarget } from '../shared/contract/workshop.ts'
import { useScansStore } from '../stores/scans.ts'
import { useSessionStore } from '../stores/session.ts'
import { useWorkshopStore } from '../stores/workshop.ts'

/** A serial is written in capitals; a scanner with Caps Lock on sends small letters. An address counts by its end. */
export function cleanCode(text: string): string {
  const trimmed = text.trim()
  const last = /^https?:\/\//i.test(trimmed)
    ? (trimmed.split(/[?#]/)[0]!.split('/').filter(Boolean).at(-1) ?? '')
    : trimmed
  return /^[a-z0-9]+$/i.test(last) ? last.toUpperCase() : last
}

/** Looks up what a scanned or typed code belongs to, and goes there. */
export function useScanTarget() {
  const router = useRouter()
  const route = useRoute()
  const scans = useScansStore()
  const session = useSessionStore()
  const workshop = useWorkshopStore()
  const resolving = ref(false)
  const problem = shallowRef<ApiProblem | null>(null)
  /** what the scan did, when it did not change the page */
  const done = ref('')
  let latest = 0

  function placeOf(target: ScanTarget): RouteLocationRaw | null {
    switch (target.kind) {
      case 'run':
        return { name: 'run', params: { id: target.runId } }
      case 'unknownSerial':
        return session.may('runChecks') ? { name: 'check', params: { serial: target.serial } } : null
      case 'instrument': {
        // Whoever is looking things up goes on looking things up; at the bench a scan is the next check.
        const toCheck =
          session.may('runChecks') && route.name !== 'instruments' && route.name !== 'instrument'
        return { name: toCheck ? 'check' : 'instrument', params: { serial: target.serial } }
      }
      case 'bench':
        return null
    }
  }

  async function open(text: string): Promise<void> {
    const code = cleanCode(text)
    if (code === '') return
    const mine = ++latest
    resolving.value = true
    problem.value = null
    done.value = ''
    try {
      const target = await scans.resolve(code)
      if (mine !== latest) return
      if (target.kind === 'bench') {
        workshop.chooseBench(target.benchId)
        done.value = `This terminal now stands at bench ${target.name}.`
        return
      }
      const place = placeOf(target)
      if (place) await router.push(place)
      else done.value = `No instrument has the serial ${code}.`
    } catch (cause) {
      if (mine === latest) problem.value = toApiProblem(cause)
    } finally {
      if (mine === latest) resolving.value = false
    }
  }

  return { open, resolving, problem, done }
}
