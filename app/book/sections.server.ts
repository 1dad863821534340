import { createHash } from 'node:crypto'
import { recordHistory } from '~/projects/history.server'
import type { Database } from '~database/connection.server'
import { madeFrom, type SectionKey, type SectionStatus, sections } from './sections'

interface SectionRow {
  section: SectionKey
  digest: string | null
  changed_at: Date | null
  checked_digest: string | null
  checked_at: Date | null
  checked_by_name: string | null
}

function combined(section: SectionKey, digests: Map<SectionKey, string | null>): string {
  const hash = createHash('sha256')
  for (const key of [section, ...madeFrom[section]]) hash.update(`${key}=${digests.get(key) ?? ''};`)
  return hash.digest('hex')
}

async function sectionRows(db: Database, projectId: number): Promise<SectionRow[]> {
  return db('book_sections')
    .leftJoin('users', 'users.id', 'book_sections.checked_by')
    .where('project_id', projectId)
    .select(
      'section',
      'digest',
      'changed_at',
      'checked_digest',
      'checked_at',
      'users.name as checked_by_name',
    )
}

/**
 * Records what a section holds now; call it in the transaction of the change.
 * `content` is anything JSON can hold; its SHA-256 becomes the section's digest, null when there is nothing.
 */
export async function recordSection(
  db: Database,
  projectId: number,
  section: SectionKey,
  content: unknown,
  userId: number,
): Promise<void> {
  const digest = content === null ? null : createHash('sha256').update(JSON.stringify(content)).digest('hex')
  const values = { digest, changed_at: new Date(), changed_by: userId }
  await db('book_sections')
    .insert({ project_id: projectId, section, ...values })
    .onConflict(['project_id', 'section'])
    .merge(values)
}

/** The state of every section of a book, in order: what the spine shows. */
export async function sectionStates(db: Database, projectId: number): Promise<SectionStatus[]> {
  const rows = new Map((await sectionRows(db, projectId)).map((row) => [row.section, row]))
  const digests = new Map([...rows].map(([key, row]) => [key, row.digest]))
  return sections.map(({ key }) => {
    const row = rows.get(key)
    const digest = combined(key, digests)
    const state = !row?.digest
      ? 'empty'
      : !row.checked_digest
        ? 'drafted'
        : row.checked_digest === digest
          ? 'checked'
          : 'changed since check'
    return {
      key,
      state,
      digest,
      changedAt: row?.changed_at ?? null,
      checkedAt: row?.checked_at ?? null,
      checkedBy: row?.checked_by_name ?? null,
    }
  })
}

/** The state of one section. */
export async function sectionStatus(
  db: Database,
  projectId: number,
  section: SectionKey,
): Promise<SectionStatus> {
  const status = (await sectionStates(db, projectId)).find(({ key }) => key === section)
  if (!status) throw new Error(`The book has no section ${section}.`)
  return status
}

/** One digest over the named sections: tells whether a run or a package still belongs to the book as it stands. */
export async function digestOf(
  db: Database,
  projectId: number,
  keys: readonly SectionKey[],
): Promise<string> {
  const rows = await sectionRows(db, projectId)
  const digests = new Map(rows.map((row) => [row.section, row.digest]))
  const hash = createHash('sha256')
  for (const key of keys) hash.update(`${key}=${digests.get(key) ?? ''};`)
  return hash.digest('hex')
}

export type CheckAnswer = 'checked' | 'nothing to check' | 'changed meanwhile'

/**
 * Marks a section as checked in its present state, and in no other than the checker saw: `seen` is the digest of the
 * page that was checked.
 */
export async function checkSection(
  db: Database,
  projectId: number,
  section: SectionKey,
  userId: number,
  seen: string,
): Promise<CheckAnswer> {
  return db.transaction(async (trx): Promise<CheckAnswer> => {
    const rows = await trx('book_sections')
      .where({ project_id: projectId })
      .forUpdate()
      .select('section', 'digest')
    const digests = new Map<SectionKey, string | null>(rows.map((row) => [row.section, row.digest]))
    if (!digests.get(section)) return 'nothing to check'
    const digest = combined(section, digests)
    if (digest !== seen) return 'changed meanwhile'
    await trx('book_sections')
      .where({ project_id: projectId, section })
      .update({ checked_digest: digest, checked_at: new Date(), checked_by: userId })
    await recordHistory(trx, { projectId, userId, section, action: 'checked section', subject: section })
    return 'checked'
  })
}
