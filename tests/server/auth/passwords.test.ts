import { compareSync } from 'bcryptjs'
import { afterAll, describe, expect, it } from 'vitest'
import { createPasswords } from '../../../server/auth/passwords.ts'

const passwords = createPasswords({ bcryptCost: 4 })
afterAll(() => passwords.close())

describe('createPasswords()', () => {
  it('hash() gives a bcrypt hash of the set cost that others read too', async () => {
    const hash = await passwords.hash('correct horse battery')
    expect(hash).toMatch(/^\$2[aby]\$04\$[./A-Za-z0-9]{53}$/)
    expect(compareSync('correct horse battery', hash)).toBe(true)
  })

  it('matches() tells right from wrong', async () => {
    const hash = await passwords.hash('correct horse battery')
    expect(await passwords.matches('correct horse battery', hash)).toBe(true)
    expect(await passwords.matches('correct horse batterY', hash)).toBe(false)
  })

  it('matches() without a hash says no', async () => {
    expect(await passwords.matches('correct horse battery', null)).toBe(false)
  })

  it('matches() without a hash takes the time of a real comparison', async () => {
    const slow = createPasswords({ bcryptCost: 10 })
    const hash = await slow.hash('correct horse battery')
    const measure = async (against: string | null) => {
      const startedAt = performance.now()
      await slow.matches('wrong password', against)
      return performance.now() - startedAt
    }
    const real = await measure(hash)
    const nobody = await measure(null)
    await slow.close()
    // At cost 10 a comparison takes some 100 ms; a stand-in that is no hash would be refused in well under 1 ms.
    expect(nobody).toBeGreaterThan(real / 10)
  })

  it('isOutdated() tells a hash of another cost', async () => {
    const hash = await passwords.hash('correct horse battery')
    expect(passwords.isOutdated(hash)).toBe(false)
    expect(createPasswords({ bcryptCost: 12 }).isOutdated(hash)).toBe(true)
  })

  it('rejects a stored hash that is damaged and goes on serving', async () => {
    expect(await passwords.matches('x', 'damaged')).toBe(false)
    expect(await passwords.matches('x', await passwords.hash('x'))).toBe(true)
  })

  it('does not hold up the event loop while it hashes', async () => {
    const slow = createPasswords({ bcryptCost: 11 })
    let turns = 0
    const timer = setInterval(() => turns++, 5)
    await slow.hash('correct horse battery')
    clearInterval(timer)
    await slow.close()
    // Hashing here takes some 200 ms; on the event loop not one turn would have come through.
    expect(turns).toBeGreaterThan(5)
  })

  it('refuses with a wait when too many are waiting', async () => {
    const busy = createPasswords({ bcryptCost: 4 })
    const results = await Promise.allSettled(
      Array.from({ length: 60 }, () => busy.hash('correct horse battery')),
    )
    await busy.close()
    const refused = results.filter(({ status }) => status === 'rejected')
    expect(refused).toHaveLength(10)
    expect(refused[0]).toMatchObject({ reason: { code: 'sign-in.wait' } })
  })
})
