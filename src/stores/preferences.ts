import { defineStore } from 'pinia'
import { computed, ref, watch } from 'vue'
import { z } from 'zod'
import type { LevelUnit } from '../format.ts'
import { keep, readKept } from './storage.ts'

export type Theme = 'light' | 'dark'
export type ThemeChoice = Theme | 'system'

const KeptUnit = z.enum(['dBV', 'dBu'])
const KeptTheme = z.enum(['light', 'dark'])

/** What a terminal remembers of how things are shown. */
export const usePreferencesStore = defineStore('preferences', () => {
  const systemDark = matchMedia('(prefers-color-scheme: dark)')
  const system = ref<Theme>(systemDark.matches ? 'dark' : 'light')
  systemDark.addEventListener('change', (event) => {
    system.value = event.matches ? 'dark' : 'light'
  })

  const themeChoice = ref<ThemeChoice>(readKept('theme', KeptTheme) ?? 'system')
  /** what is shown; a canvas watches it and draws again */
  const theme = computed<Theme>(() => (themeChoice.value === 'system' ? system.value : themeChoice.value))
  const levelUnit = ref<LevelUnit>(readKept('levelUnit', KeptUnit) ?? 'dBV')

  watch(
    theme,
    (now) => {
      document.documentElement.dataset.theme = now
    },
    { immediate: true, flush: 'sync' },
  )

  function chooseTheme(choice: ThemeChoice): void {
    themeChoice.value = choice
    keep('theme', choice === 'system' ? null : choice)
  }

  function chooseLevelUnit(unit: LevelUnit): void {
    levelUnit.value = unit
    keep('levelUnit', unit)
  }

  return { theme, themeChoice, levelUnit, chooseTheme, chooseLevelUnit }
})
