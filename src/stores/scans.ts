import { defineStore } from 'pinia'
import { ref } from 'vue'
import { api } from '../api/http.ts'
import type { ScanTarget } from '../shared/contract/workshop.ts'

export const useScansStore = defineStore('scans', () => {
  /** as it stands in the scan field */
  const lastCode = ref('')

  async function resolve(code: string): Promise<ScanTarget> {
    lastCode.value = code
    return api('scan.resolve', { params: { code } })
  }

  return { lastCode, resolve }
})
