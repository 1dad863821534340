import { DateTime } from 'luxon'
import { findRow, saveRows } from '~/book/rows.server'
import { type HeadField, headAt } from '~/heads/field'
import { type Run, runHeads, runPoints } from '~/heads/runs.server'
import type { Project } from '~/projects/project'
import { lastReadings, type MeasuredOn, measuredHeads } from '~/readings/readings.server'
import { decodeHeads } from '~/solver/heads-buffer'
import { convert } from '~/units'
import type { Database } from '~database/connection.server'
import { type Comparison, comparisonRowId } from './comparison'
import { type FitLine, type FitSpan, inProjectUnit, nearestWithinDays } from './fit'
import { fitKinds } from './fit-kinds.server'
import { type FitStatistics, fitStatistics } from './statistics'

export interface Fit {
  span: FitSpan
  /** Metres. */
  lines: FitLine[]
  /** In the project's length unit. */
  statistics: FitStatistics | null
}

/** The span in instants: days begin and end at the site's midnight; a date means its noon. */
function instants(span: FitSpan, timeZone: string): MeasuredOn {
  const at = (day: string, options: { hour: number }) =>
    DateTime.fromISO(day, { zone: timeZone }).set(options)
  if ('date' in span)
    return { nearest: at(span.date, { hour: 12 }).toJSDate(), withinDays: nearestWithinDays }
  return {
    from: at(span.from, { hour: 0 }).toJSDate(),
    to: at(span.to, { hour: 0 }).plus({ days: 1 }).minus(1).toJSDate(),
  }
}

/** The day of the newest head of any instrument, in the site's time zone; today when there is none. */
export async function dayOfLastReading(db: Database, project: Project): Promise<string> {
  const last = (await lastReadings(db, project.id)).flatMap((r) => (r.lastHead ? [r.lastHead.at] : [])).sort()
  const newest = last.at(-1)
  const day = newest ? DateTime.fromISO(newest) : DateTime.now()
  return day.setZone(project.timeZone).toISODate() ?? ''
}

/**
 * Holds a finished run against the readings of a day or a window. The modelled head is the run's head at the
 * instrument's named point, or at its own place in the head field when it has none.
 */
export async function fitOf(db: Database, project: Project, run: Run, span: FitSpan): Promise<Fit> {
  const measured = await measuredHeads(db, project.id, instants(span, project.timeZone))
  const points = new Map((await runPoints(db, project.id, run.id)).map((point) => [point.pointId, point]))
  const buffer = await runHeads(db, project.id, run.id)
  const field = buffer ? fieldOf(buffer) : null
  const lines = measured.map((line): FitLine => {
    const point = line.pointId === null ? undefined : points.get(line.pointId)
    const model = point ? { head: point.head, why: point.why } : headInField(field, run, line)
    return {
      instrumentId: line.instrumentId,
      name: line.name,
      x: line.x,
      y: line.y,
      measured: line.head,
      firstAt: line.firstAt,
      lastAt: line.lastAt,
      n: line.n,
      modelled: model.head,
      residual: line.head === null || model.head === null ? null : line.head - model.head,
      why: line.why ?? model.why,
    }
  })
  lines.sort((a, b) => a.name.localeCompare(b.name, 'en', { numeric: true }))
  const unit = project.units.length
  const pairs = lines.flatMap((line) => {
    const pair = {
      measured: inProjectUnit(line.measured, unit),
      modelled: inProjectUnit(line.modelled, unit),
    }
    return pair.measured === null || pair.modelled === null
      ? []
      : [{ measured: pair.measured, modelled: pair.modelled }]
  })
  return { span, lines, statistics: fitStatistics(pairs) }
}

function fieldOf(buffer: Uint8Array): HeadField {
  const { grid, heads } = decodeHeads(buffer)
  return { xEdges: grid.xEdges, yEdges: grid.yEdges, heads }
}

function headInField(
  field: HeadField | null,
  run: Run,
  { x, y }: { x: number; y: number },
): { head: number | null; why: string | null } {
  if (!field) return { head: null, why: 'the run has no head field' }
  const head = headAt(field, x, y)
  if (Number.isNaN(head)) return { head: null, why: 'outside the model, or dry in it' }
  return { head: convert({ value: head, unit: run.model.units.length }, 'm'), why: null }
}

/** The comparison that the book keeps, or undefined. */
export async function keptComparison(db: Database, projectId: number) {
  return findRow<Comparison>(db, projectId, 'comparison', comparisonRowId)
}

/**
 * Keeps a comparison as section 7 of the book; the one kept before stays in the history.
 * Returns false when somebody else kept another one at the same moment.
 */
export async function recordFit(
  db: Database,
  project: Project,
  run: Run,
  span: FitSpan,
  userId: number,
): Promise<boolean> {
  const { statistics } = await fitOf(db, project, run, span)
  const body: Comparison = { runId: run.id, runNumber: run.number, span, statistics }
  const before = await keptComparison(db, project.id)
  const answer = await saveRows(db, {
    projectId: project.id,
    userId,
    kinds: fitKinds,
    changes: [
      before
        ? { op: 'edit', kind: 'comparison', id: comparisonRowId, version: before.version, body }
        : { op: 'add', kind: 'comparison', id: comparisonRowId, body },
    ],
  })
  if (!answer.ok && answer.problems.length > 0) {
    throw new Error(`The comparison was refused: ${JSON.stringify(answer.problems)}`)
  }
  return answer.ok
}
