import { randomUUID } from 'node:crypto'
import { IANAZone } from 'luxon'
import { saveRows } from '~/book/rows.server'
import type { Project } from '~/projects/project'
import { parseQuantity } from '~/units'
import type { Database } from '~database/connection.server'
import type { LevelAnswer, LevelEntry } from './level-form'
import { Clockwork, readTime } from './read-time'
import { readingKinds } from './reading-kinds.server'

/** The instant at which the site's clock shows a date and time, in ISO 8601; a message where it never does. */
export function siteInstant(
  date: string,
  time: string,
  timeZone: string,
): { at: string } | { problem: string } {
  const local = readTime(date, time || '00:00', 'year first')
  if (!local) return { problem: 'Give a date such as 2026-03-14.' }
  const instant = new Clockwork({ rule: 'site', repeated: 'first' }, timeZone).instant(local, '')
  return instant.ok ? { at: new Date(instant.at).toISOString() } : { problem: instant.reason }
}

/** Minutes east of UTC of a zone's clock without summer time, this year. */
export function winterOffset(timeZone: string): number {
  const zone = IANAZone.create(timeZone)
  const year = new Date().getUTCFullYear()
  return Math.min(zone.offset(Date.UTC(year, 0, 15)), zone.offset(Date.UTC(year, 6, 15)))
}

/** Date and time of an instant as the site's clock shows it, for a form. */
export function siteClock(at: string, timeZone: string): { date: string; time: string } {
  const parts = new Intl.DateTimeFormat('en-CA', {
    year: 'numeric',
    month: '2-digit',
    day: '2-digit',
    hour: '2-digit',
    minute: '2-digit',
    hourCycle: 'h23',
    timeZone,
  }).formatToParts(new Date(at))
  const part = (type: string) => parts.find((one) => one.type === type)?.value ?? ''
  return {
    date: `${part('year')}-${part('month')}-${part('day')}`,
    time: `${part('hour')}:${part('minute')}`,
  }
}

/**
 * Adds a reference level to an instrument, or corrects one whose version is still the one that was seen. What is wrong comes
 * back by field, and nothing is saved then.
 */
export async function saveLevel(
  db: Database,
  order: {
    project: Pick<Project, 'id' | 'timeZone' | 'units'>
    userId: number
    instrumentId: string
    row?: { id: string; version: number }
    entry: LevelEntry
  },
): Promise<LevelAnswer> {
  const { project, entry, row } = order
  const problems: Record<string, string> = {}
  const level = parseQuantity(entry.level, 'length', project.units.length)
  if (!level.ok) problems.level = level.message
  const from = siteInstant(entry.date, entry.time, project.timeZone)
  if ('problem' in from) problems.date = from.problem
  if (entry.reason.trim() === '') problems.reason = 'Give the reason: first survey, casing cut, resurvey.'
  if (!level.ok || 'problem' in from || Object.keys(problems).length > 0) return { saved: false, problems }
  const body = {
    instrumentId: order.instrumentId,
    from: from.at,
    level: level.quantity,
    levelled: entry.levelled,
    reason: entry.reason,
    source: entry.source,
  }
  const kind = 'reference level'
  const answer = await saveRows(db, {
    projectId: project.id,
    userId: order.userId,
    changes: [row ? { op: 'edit', kind, ...row, body } : { op: 'add', kind, id: randomUUID(), body }],
    kinds: readingKinds,
  })
  if (answer.ok) return { saved: true, problems: {} }
  for (const problem of answer.problems) {
    problems[problem.field === 'from' ? 'date' : problem.field] ??= problem.message
  }
  const theirs = answer.conflicts[0]?.theirs
  if (answer.conflicts.length > 0) {
    problems[''] =
      `${theirs?.by ?? 'Somebody'} ${theirs ? 'changed' : 'deleted'} this reference level meanwhile. What you entered is still here.`
  }
  return { saved: false, problems }
}

/** Takes a reference level out of the history; its versions stay on record. Returns a message when it is not done. */
export async function deleteLevel(
  db: Database,
  order: { projectId: number; userId: number; id: string; version: number },
): Promise<string | null> {
  const { projectId, userId, id, version } = order
  const answer = await saveRows(db, {
    projectId,
    userId,
    changes: [{ op: 'delete', kind: 'reference level', id, version }],
    kinds: readingKinds,
  })
  if (answer.ok) return null
  return answer.conflicts.length > 0
    ? 'Somebody changed this reference level meanwhile: it was not deleted.'
    : (answer.problems[0]?.message ?? 'It was not deleted.')
}
