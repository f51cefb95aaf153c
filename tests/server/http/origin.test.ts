import { describe, expect, it } from 'vitest'
import { isOwnOrigin } from '../../../server/http/origin.ts'

const open = { publicUrl: null }
const fixed = { publicUrl: 'https://bench.harrowlane.test' }

describe('isOwnOrigin()', () => {
  it('accepts the host by which the server was reached', () => {
    expect(isOwnOrigin({ origin: 'http://10.0.0.5:4180', host: '10.0.0.5:4180' }, open)).toBe(true)
  })

  it('refuses another host, another port, a sandboxed page and nonsense', () => {
    const host = '10.0.0.5:4180'
    for (const origin of ['http://10.0.0.6:4180', 'http://10.0.0.5:4181', 'http://10.0.0.5', 'null', ''])
      expect(isOwnOrigin({ origin, host }, open)).toBe(false)
  })

  it('accepts the public address behind a proxy that hides the host', () => {
    expect(isOwnOrigin({ origin: fixed.publicUrl, host: '127.0.0.1:4180' }, fixed)).toBe(true)
  })

  it('refuses plain http when the public address is https', () => {
    const headers = { origin: 'http://bench.harrowlane.test', host: 'bench.harrowlane.test' }
    expect(isOwnOrigin(headers, fixed)).toBe(false)
  })

  it('accepts programs that are no browser and refuses a browser that says it comes from elsewhere', () => {
    const host = '10.0.0.5:4180'
    expect(isOwnOrigin({ host }, open)).toBe(true)
    expect(isOwnOrigin({ host, 'sec-fetch-site': 'same-origin' }, open)).toBe(true)
    expect(isOwnOrigin({ host, 'sec-fetch-site': 'cross-site' }, open)).toBe(false)
    expect(isOwnOrigin({ host, 'sec-fetch-site': 'same-site' }, open)).toBe(false)
  })
})
