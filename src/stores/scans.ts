import { defineStore } from 'pinia'
import { api } from '../api/http.ts'
import type { ScanTarget } from '../shared/contract/workshop.ts'

export const useScansStore = defineStore('scans', () => {
  function resolve(code: string): Promise<ScanTarget> {
    return api('scan.resolve', { params: { code } })
  }

  return { resolve }
})
