import { z } from 'zod'
import { AcceptInvite, InviteLook, SignIn, SignedIn, SignOut } from './auth.ts'
import { BenchView, Cautions, InstrumentSummary, InstrumentView, ModelView, ScanTarget } from './workshop.ts'
import { Id, Instant } from './quantities.ts'
import { RecomputeReport, RunActionRequest, RunStart, RunSummary, RunTrace, RunView, Serial } from './runs.ts'
import { SimulationCommand } from './simulation.ts'
import type { ErrorCode } from './errors.ts'
import type { Permission } from './permissions.ts'

export const API = '/api/v1'

/** 'public': nobody signed in is needed; 'signedIn': anyone who is; else the permission that it takes. */
export type Access = 'public' | 'signedIn' | Permission

export interface RouteContract {
  method: 'get' | 'post' | 'put' | 'delete'
  /** Express form below API: '/runs/:id' */
  path: string
  access: Access
  summary: string
  params?: z.ZodObject
  query?: z.ZodObject
  body?: z.ZodType
  /** body of the 2xx answer */
  answer: z.ZodType
  status: 200 | 201
  /** beyond those that every route can give (request.invalid, sign-in.required, permission.denied, storage.away, server.error) */
  errors: readonly ErrorCode[]
}

const Nothing = z.object({})
const byId = z.object({ id: Id })
const bySerial = z.object({ serial: Serial })
/** Keyset paging: `after` is the `next` of the page before. */
const page = {
  after: z.string().max(200).optional(),
  limit: z.coerce.number().int().min(1).max(100).default(25),
}

export function pageOf<T extends z.ZodType>(item: T) {
  return z.object({ items: z.array(item), next: z.string().nullable() })
}

function contract<const T extends RouteContract>(route: T): T {
  return route
}

/** Every route of the HTTP API: the one registry that server, client, OpenAPI and the role tests read. */
export const ROUTES = {
  'health.read': contract({
    method: 'get',
    path: '/health',
    access: 'public',
    summary: 'Is the server up and does its database answer',
    answer: z.object({ ok: z.boolean(), database: z.boolean(), method: z.int(), version: z.string() }),
    status: 200,
    errors: [],
  }),
  'openapi.read': contract({
    method: 'get',
    path: '/openapi.json',
    access: 'public',
    summary: 'This API as OpenAPI 3.1',
    answer: z.record(z.string(), z.unknown()),
    status: 200,
    errors: [],
  }),
  'protocol.read': contract({
    method: 'get',
    path: '/bench-protocol.json',
    access: 'public',
    summary: 'The bench protocol as JSON Schema',
    answer: z.record(z.string(), z.unknown()),
    status: 200,
    errors: [],
  }),

  'auth.signIn': contract({
    method: 'post',
    path: '/auth/sign-in',
    access: 'public',
    summary: 'Sign in with e-mail and password',
    body: SignIn,
    answer: SignedIn,
    status: 200,
    errors: ['sign-in.wrong', 'sign-in.wait'],
  }),
  'auth.refresh': contract({
    method: 'post',
    path: '/auth/refresh',
    access: 'public',
    summary: 'Exchange the refresh cookie for a new one',
    answer: SignedIn,
    status: 200,
    errors: ['sign-in.required', 'sign-in.reused'],
  }),
  'auth.signOut': contract({
    method: 'post',
    path: '/auth/sign-out',
    access: 'signedIn',
    summary: 'Sign out here or everywhere',
    body: SignOut,
    answer: Nothing,
    status: 200,
    errors: [],
  }),
  'auth.me': contract({
    method: 'get',
    path: '/auth/me',
    access: 'signedIn',
    summary: 'Who is signed in',
    answer: SignedIn,
    status: 200,
    errors: [],
  }),
  'invites.look': contract({
    method: 'get',
    path: '/invites/:token',
    access: 'public',
    summary: 'Whom a one-time link is for',
    params: z.object({ token: z.string().min(20).max(200) }),
    answer: InviteLook,
    status: 200,
    errors: ['invite.invalid'],
  }),
  'invites.accept': contract({
    method: 'post',
    path: '/invites/accept',
    access: 'public',
    summary: 'Set the first password by a one-time link',
    body: AcceptInvite,
    answer: SignedIn,
    status: 200,
    errors: ['invite.invalid', 'password.weak'],
  }),

  'cautions.read': contract({
    method: 'get',
    path: '/cautions',
    access: 'runChecks',
    summary: 'Were the cautions read this shift',
    answer: Cautions,
    status: 200,
    errors: [],
  }),
  'cautions.acknowledge': contract({
    method: 'post',
    path: '/cautions',
    access: 'runChecks',
    summary: 'The cautions were read',
    body: z.object({ id: Id }),
    answer: Cautions,
    status: 200,
    errors: [],
  }),

  'scan.resolve': contract({
    method: 'get',
    path: '/scan/:code',
    access: 'read',
    summary: 'What a scanned code belongs to',
    params: z.object({ code: z.string().min(1).max(200) }),
    answer: ScanTarget,
    status: 200,
    errors: ['serial.invalid'],
  }),
  'models.list': contract({
    method: 'get',
    path: '/models',
    access: 'read',
    summary: 'All models with the sheet in force',
    answer: z.object({ items: z.array(ModelView) }),
    status: 200,
    errors: [],
  }),
  'benches.list': contract({
    method: 'get',
    path: '/benches',
    access: 'read',
    summary: 'All benches and what they are doing',
    answer: z.object({ items: z.array(BenchView) }),
    status: 200,
    errors: [],
  }),
  'benches.simulate': contract({
    method: 'post',
    path: '/benches/:id/simulation',
    access: 'runChecks',
    summary: 'Command to a simulated bench',
    params: byId,
    body: SimulationCommand,
    answer: Nothing,
    status: 200,
    errors: ['bench.unknown', 'bench.offline', 'bench.not-simulated', 'run.not-yours'],
  }),

  'instruments.list': contract({
    method: 'get',
    path: '/instruments',
    access: 'read',
    summary: 'Instruments, newest first',
    query: z.object({ ...page, search: z.string().max(40).optional() }),
    answer: pageOf(InstrumentSummary),
    status: 200,
    errors: [],
  }),
  'instruments.read': contract({
    method: 'get',
    path: '/instruments/:serial',
    access: 'read',
    summary: 'One instrument and its runs',
    params: bySerial,
    answer: InstrumentView,
    status: 200,
    errors: ['instrument.unknown'],
  }),

  'runs.list': contract({
    method: 'get',
    path: '/runs',
    access: 'read',
    summary: 'Runs, newest first',
    query: z.object({ ...page, from: Instant.optional(), to: Instant.optional() }),
    answer: pageOf(RunSummary),
    status: 200,
    errors: [],
  }),
  'runs.start': contract({
    method: 'post',
    path: '/runs',
    access: 'runChecks',
    summary: 'Open a run of one serial on one bench',
    body: RunStart,
    answer: RunView,
    status: 201,
    errors: [
      'instrument.unknown',
      'instrument.model-differs',
      'model.unknown',
      'sheet.none-in-force',
      'bench.unknown',
      'bench.offline',
      'bench.busy',
      'run.serial-busy',
      'cautions.needed',
    ],
  }),
  'runs.read': contract({
    method: 'get',
    path: '/runs/:id',
    access: 'read',
    summary: 'One run with everything measured and judged',
    params: byId,
    answer: RunView,
    status: 200,
    errors: ['run.unknown'],
  }),
  'runs.trace': contract({
    method: 'get',
    path: '/runs/:id/trace',
    access: 'read',
    summary: 'Trace of a run, thinned for drawing',
    params: byId,
    query: z.object({ points: z.coerce.number().int().min(10).max(20000).default(3000) }),
    answer: RunTrace,
    status: 200,
    errors: ['run.unknown'],
  }),
  'runs.act': contract({
    method: 'post',
    path: '/runs/:id/actions',
    access: 'runChecks',
    summary: 'Something the person does during the run',
    params: byId,
    body: RunActionRequest,
    answer: RunView,
    status: 200,
    errors: ['run.unknown', 'run.not-open', 'run.action-not-now', 'run.not-yours'],
  }),
  'runs.takeOver': contract({
    method: 'post',
    path: '/runs/:id/take-over',
    access: 'runChecks',
    summary: 'Go on with the open run of another person (its opener or a lead)',
    params: byId,
    body: z.object({ id: Id, reason: z.string().min(3).max(200) }),
    answer: RunView,
    status: 200,
    errors: ['run.unknown', 'run.not-open', 'run.not-yours'],
  }),
  'runs.recompute': contract({
    method: 'post',
    path: '/runs/:id/recompute',
    access: 'read',
    summary: 'Compute a stored run again and compare',
    params: byId,
    answer: RecomputeReport,
    status: 200,
    errors: ['run.unknown', 'run.not-open'],
  }),
} as const

export type RouteKey = keyof typeof ROUTES
type Contract<K extends RouteKey> = (typeof ROUTES)[K]
type Part<K extends RouteKey, P extends string> =
  Contract<K> extends Record<P, infer S extends z.ZodType> ? S : never

export type RouteParams<K extends RouteKey> = [Part<K, 'params'>] extends [never]
  ? undefined
  : z.output<Part<K, 'params'>>
export type RouteQuery<K extends RouteKey> = [Part<K, 'query'>] extends [never]
  ? undefined
  : z.output<Part<K, 'query'>>
export type RouteBody<K extends RouteKey> = [Part<K, 'body'>] extends [never]
  ? undefined
  : z.output<Part<K, 'body'>>
export type RouteAnswer<K extends RouteKey> = z.output<Contract<K>['answer']>
