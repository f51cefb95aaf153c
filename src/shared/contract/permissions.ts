import { z } from 'zod'

export const Role = z.enum(['installer', 'repairer', 'qc', 'engineer', 'lead', 'returnsDesk', 'admin'])
export type Role = z.infer<typeof Role>

export const ROLE_NAMES: Record<Role, string> = {
  installer: 'Installer',
  repairer: 'Repairer',
  qc: 'QC',
  engineer: 'Engineer',
  lead: 'Lead',
  returnsDesk: 'Returns desk',
  admin: 'Admin',
}

export const Permission = z.enum([
  'runChecks',
  'verifyBench',
  'rework',
  'placeHold',
  'liftHold',
  'ship',
  'returnsIntake',
  'returnsDecide',
  'draftThresholds',
  'putInForce',
  'planWork',
  'stopAnyRun',
  'administer',
  'read',
])
export type Permission = z.infer<typeof Permission>

/** Who may do what: the one table that server and client share. The server decides, the client only hides. */
export const PERMISSIONS: Record<Permission, readonly Role[]> = {
  runChecks: ['installer', 'repairer', 'qc', 'engineer', 'lead'],
  verifyBench: ['installer', 'repairer', 'qc', 'engineer', 'lead'],
  rework: ['repairer', 'qc', 'lead'],
  placeHold: ['qc', 'lead'],
  liftHold: ['qc', 'lead'],
  ship: ['qc', 'lead', 'returnsDesk'],
  returnsIntake: ['qc', 'lead', 'returnsDesk'],
  returnsDecide: ['qc'],
  draftThresholds: ['engineer'],
  putInForce: ['qc', 'engineer'],
  planWork: ['lead'],
  stopAnyRun: ['lead'],
  administer: ['admin'],
  read: ['installer', 'repairer', 'qc', 'engineer', 'lead', 'returnsDesk', 'admin'],
}

/** True when any of the roles holds the permission. */
export function isAllowed(roles: readonly Role[], permission: Permission): boolean {
  return roles.some((role) => PERMISSIONS[permission].includes(role))
}

/** Everything that the roles together allow, in the table's order. */
export function permissionsOf(roles: readonly Role[]): Permission[] {
  return Permission.options.filter((permission) => isAllowed(roles, permission))
}
