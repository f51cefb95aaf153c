import { describe, expect, it } from 'vitest'
import { foldedSerial } from '../../../server/instruments/foldedSerial.ts'

describe('foldedSerial()', () => {
  it('makes O and 0, I and 1 the same, in any case', () => {
    expect(foldedSerial('HL24O1I')).toBe('HL24011')
    expect(foldedSerial('hl24o1i')).toBe(foldedSerial('HL24011'))
  })

  it('drops all that is neither letter nor digit', () => {
    expect(foldedSerial(' HL-24 01/873% ')).toBe('HL2401873')
    expect(foldedSerial('--')).toBe('')
  })
})
