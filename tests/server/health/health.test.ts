import request from 'supertest'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { createTestApp } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
beforeAll(async () => {
  test = await createTestApp()
})
afterAll(() => test.close())

describe('GET /health', () => {
  it('says that server and database answer, and which program it is', async () => {
    const { body } = await request(test.app).get(`${API}/health`).expect(200)
    expect(body).toEqual({ ok: true, database: true, method: 1, version: '0.0.0-test' })
  })
})

describe('GET /openapi.json', () => {
  it('is open to everyone', async () => {
    const { body } = await request(test.app).get(`${API}/openapi.json`).expect(200)
    expect(body).toMatchObject({ openapi: '3.1.0', info: { version: '0.0.0-test' } })
  })
})
