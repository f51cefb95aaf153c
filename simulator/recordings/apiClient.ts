import { ERRORS, Problem } from '../../src/shared/contract/errors.ts'
import { API, ROUTES } from '../../src/shared/contract/routes.ts'
import type { RouteAnswer, RouteKey } from '../../src/shared/contract/routes.ts'
import { RecordingError } from '../signal/recordingError.ts'

export interface ApiCall {
  params?: Record<string, string>
  body?: unknown
}

/** A person's way to the server's HTTP API, as the page uses it: by the contract, with the sign-in's cookies. */
export class ApiClient {
  private readonly url: string
  private readonly cookies = new Map<string, string>()

  constructor(url: string) {
    this.url = url.replace(/\/+$/, '')
  }

  async signIn(email: string, password: string): Promise<RouteAnswer<'auth.signIn'>> {
    return await this.call('auth.signIn', { body: { email, password } })
  }

  /** Refused: throws a RecordingError with what happened and what to do. */
  async call<K extends RouteKey>(key: K, { params = {}, body }: ApiCall = {}): Promise<RouteAnswer<K>> {
    const contract = ROUTES[key]
    const place = contract.path.replace(/:(\w+)/g, (_, name: string) =>
      encodeURIComponent(params[name] ?? ''),
    )
    const response = await this.send(contract.method.toUpperCase(), `${this.url}${API}${place}`, body)
    for (const line of response.headers.getSetCookie()) {
      const [pair = ''] = line.split(';')
      const at = pair.indexOf('=')
      this.cookies.set(pair.slice(0, at), pair.slice(at + 1))
    }
    const answer: unknown = await response.json().catch(() => null)
    if (!response.ok) throw new RecordingError(sentenceOf(answer, response.status))
    return contract.answer.parse(answer) as RouteAnswer<K>
  }

  private async send(method: string, address: string, body: unknown): Promise<Response> {
    const cookie = [...this.cookies].map(([name, value]) => `${name}=${value}`).join('; ')
    try {
      return await fetch(address, {
        method,
        headers: {
          origin: this.url,
          ...(cookie ? { cookie } : {}),
          ...(body === undefined ? {} : { 'content-type': 'application/json' }),
        },
        ...(body === undefined ? {} : { body: JSON.stringify(body) }),
      })
    } catch {
      throw new RecordingError(`The server at ${this.url} does not answer. Start it with: npm start`)
    }
  }
}

function sentenceOf(answer: unknown, status: number): string {
  const problem = Problem.safeParse(answer)
  if (!problem.success) return `The server answered with status ${status}.`
  const { code, detail, facts } = problem.data
  const { title, remedy } = ERRORS[code]
  const more = [detail, ...Object.entries(facts ?? {}).map(([name, value]) => `${name}: ${value}`)]
  const known = more.filter((part) => part !== undefined)
  return `${title} ${remedy}${known.length > 0 ? ` (${known.join(', ')})` : ''}`
}
