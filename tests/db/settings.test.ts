import path from 'node:path'
import { expect, test } from 'vitest'
import { projectDir, readSettings } from '../../db/settings.js'

test('readSettings() falls back to the demo on loopback', () => {
  expect(readSettings({})).toEqual({
    port: 4180,
    host: '127.0.0.1',
    dataDir: path.join(projectDir, '.data'),
    databasePort: 13306,
    databaseName: 'evenstrung',
    externalDatabase: undefined,
    mode: 'demo',
  })
})

test.each(['abc', '0', '65536', '80.5', '-1'])(
  'readSettings() refuses PORT=%s and says the range',
  (port) => {
    expect(() => readSettings({ PORT: port })).toThrow(
      `PORT is '${port}': set it to a whole number from 1 to 65535.`,
    )
  },
)

test('readSettings() takes an external database only with both addresses', () => {
  const appUrl = 'mysql://app:a@10.0.0.9:3306/evenstrung'
  const ownerUrl = 'mysql://owner:b@10.0.0.9:3306/evenstrung'
  expect(readSettings({ DATABASE_URL: appUrl, DATABASE_OWNER_URL: ownerUrl }).externalDatabase).toEqual({
    appUrl,
    ownerUrl,
  })
  expect(() => readSettings({ DATABASE_URL: appUrl })).toThrow(/DATABASE_OWNER_URL/)
  expect(() => readSettings({ DATABASE_OWNER_URL: ownerUrl })).toThrow(/DATABASE_URL/)
})

test.each(['mysql', 'evenstrung`; DROP', 'Evenstrung', 'evenstrung-copy'])(
  'readSettings() refuses DB_NAME=%s',
  (name) => {
    expect(() => readSettings({ DB_NAME: name })).toThrow(/^DB_NAME is/)
  },
)

test('readSettings() knows two modes', () => {
  expect(readSettings({ EVENSTRUNG_MODE: 'production' }).mode).toBe('production')
  expect(() => readSettings({ EVENSTRUNG_MODE: 'test' })).toThrow(/demo or production/)
})
