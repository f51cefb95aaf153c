import type { Knex } from 'knex'
import * as createWorkshopSettings from './202612010900_create_workshop_settings.ts'
import * as createUsers from './202612010901_create_users.ts'
import * as createUserRoles from './202612010902_create_user_roles.ts'
import * as createInvites from './202612010903_create_invites.ts'
import * as createSessions from './202612010904_create_sessions.ts'
import * as createSessionTokens from './202612010905_create_session_tokens.ts'
import * as createSignInAttempts from './202612010906_create_sign_in_attempts.ts'
import * as createAuditEntries from './202612010907_create_audit_entries.ts'
import * as createOutbox from './202612010908_create_outbox.ts'
import * as createBenches from './202612010909_create_benches.ts'
import * as createBenchVerifications from './202612010910_create_bench_verifications.ts'
import * as createModels from './202612010911_create_models.ts'
import * as createThresholdRevisions from './202612010912_create_threshold_revisions.ts'
import * as createInstruments from './202612010913_create_instruments.ts'
import * as createRuns from './202612010914_create_runs.ts'
import * as createRunReadings from './202612010915_create_run_readings.ts'
import * as createRunDetails from './202612010916_create_run_details.ts'
import * as createRunActions from './202612010917_create_run_actions.ts'
import * as createTraceSegments from './202612010918_create_trace_segments.ts'
import * as createCautionAcknowledgements from './202612010919_create_caution_acknowledgements.ts'
import * as addBenchVerificationSetup from './202612011000_add_bench_verification_setup.ts'

export interface Migration {
  up(knex: Knex): Promise<void>
  down(knex: Knex): Promise<void>
}

/** In order; the name is recorded without file extension, so that it means the same from source and from the bundle. */
export const MIGRATIONS: readonly [string, Migration][] = [
  ['202612010900_create_workshop_settings', createWorkshopSettings],
  ['202612010901_create_users', createUsers],
  ['202612010902_create_user_roles', createUserRoles],
  ['202612010903_create_invites', createInvites],
  ['202612010904_create_sessions', createSessions],
  ['202612010905_create_session_tokens', createSessionTokens],
  ['202612010906_create_sign_in_attempts', createSignInAttempts],
  ['202612010907_create_audit_entries', createAuditEntries],
  ['202612010908_create_outbox', createOutbox],
  ['202612010909_create_benches', createBenches],
  ['202612010910_create_bench_verifications', createBenchVerifications],
  ['202612010911_create_models', createModels],
  ['202612010912_create_threshold_revisions', createThresholdRevisions],
  ['202612010913_create_instruments', createInstruments],
  ['202612010914_create_runs', createRuns],
  ['202612010915_create_run_readings', createRunReadings],
  ['202612010916_create_run_details', createRunDetails],
  ['202612010917_create_run_actions', createRunActions],
  ['202612010918_create_trace_segments', createTraceSegments],
  ['202612010919_create_caution_acknowledgements', createCautionAcknowledgements],
  ['202612011000_add_bench_verification_setup', addBenchVerificationSetup],
]
