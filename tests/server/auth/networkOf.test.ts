import { describe, expect, it } from 'vitest'
import { networkOf } from '../../../server/auth/attempts.queries.ts'

describe('networkOf()', () => {
  it('takes the /64 of an IPv6 address, however it is written', () => {
    for (const address of ['2001:db8:1:2::1', '2001:0db8:0001:0002:ffff:1:2:3', '2001:db8:1:2:3:4:5:6'])
      expect(networkOf(address)).toBe('2001:db8:1:2')
    expect(networkOf('::1')).toBe('0:0:0:0')
    expect(networkOf('fe80::1%eth0')).toBe('fe80:0:0:0')
    expect(networkOf('2001:db8::')).toBe('2001:db8:0:0')
  })

  it('leaves IPv4 as it is, also inside IPv6', () => {
    for (const address of ['10.0.0.5', '::ffff:10.0.0.5', '']) expect(networkOf(address)).toBe(address)
  })
})
