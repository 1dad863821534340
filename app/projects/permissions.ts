/**
 * Who may do what. One table, used on the server and on the page.
 * A firm's administrator looks after people and projects; that alone opens no calc book.
 */
export const roles = ['project manager', 'originator', 'checker', 'approver', 'data', 'client'] as const
export type Role = (typeof roles)[number]

export const roleNames: Record<Role, string> = {
  'project manager': 'project manager',
  originator: 'hydrogeologist (originator)',
  checker: 'checker',
  approver: 'approver',
  data: 'field and data',
  client: 'client',
}

const team: readonly Role[] = ['project manager', 'originator', 'checker', 'approver', 'data']
const makers: readonly Role[] = ['originator', 'project manager']

const table = {
  view: {
    book: team,
    progress: roles,
    'issued package': roles,
    'draft package': team,
    history: team,
    settings: team,
  },
  edit: {
    cover: makers,
    basis: makers,
    ground: ['originator'],
    water: ['originator'],
    cases: ['originator'],
    readings: ['data', 'originator'],
    fit: ['originator'],
    checks: ['originator'],
    progress: ['project manager'],
    settings: ['project manager'],
  },
  run: { case: ['originator'] },
  accept: { warning: ['originator'] },
  import: { readings: ['data', 'originator'] },
  check: { section: ['checker'] },
  make: { package: makers },
  sign: { 'as originator': ['originator'], 'as checker': ['checker'], 'as approver': ['approver'] },
  issue: { package: ['project manager'] },
  manage: { members: ['project manager'] },
} as const satisfies Record<string, Record<string, readonly Role[]>>

type Table = typeof table
export type Verb = keyof Table
export type Subject<V extends Verb> = keyof Table[V] & string

export interface Member {
  userId: number
  name: string
  role: Role
}

/** One sentence of permission: can(member, 'edit', 'ground'). */
export function can<V extends Verb>(member: Pick<Member, 'role'>, verb: V, subject: Subject<V>): boolean {
  const allowed = (table[verb] as unknown as Record<string, readonly Role[]>)[subject]
  return allowed?.includes(member.role) ?? false
}

/** The whole table, for the page that shows it and the test that walks it. */
export function permissionTable(): { verb: string; subject: string; roles: readonly Role[] }[] {
  return Object.entries(table).flatMap(([verb, subjects]) =>
    Object.entries(subjects).map(([subject, allowed]) => ({
      verb,
      subject,
      roles: allowed as readonly Role[],
    })),
  )
}
