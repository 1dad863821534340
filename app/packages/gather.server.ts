import type { Assumption, Basis, Standard } from '~/basis/basis'
import { listRows } from '~/book/rows.server'
import { caseInputs } from '~/cases/inputs.server'
import type { Estimate } from '~/checks/estimate'
import { findFile } from '~/files/files.server'
import { inProjectUnit } from '~/fit/fit'
import { dayOfLastReading, fitOf } from '~/fit/fit.server'
import type { PlanImage } from '~/ground/ground'
import { acceptancesOf } from '~/heads/acceptances.server'
import { findRun, type Run } from '~/heads/runs.server'
import type { Project } from '~/projects/project'
import { listImports } from '~/readings/imports.server'
import type { Instrument, ReferenceLevel } from '~/readings/instrument'
import { firstAndLast, lastReadings } from '~/readings/readings.server'
import type { Database } from '~database/connection.server'
import type { GatheredContent, GatheredRun, Held } from './gathered'

/**
 * Gathers the book as it stands into one plain object, from which the package is drawn and hashed.
 * Throws when the run is not a finished run of this project: callers have asked before.
 */
export async function gatherContent(
  db: Database,
  project: Project,
  asked: { runId: number; againstRunId?: number; fitDate?: string },
): Promise<GatheredContent> {
  const run = await findRun(db, project.id, asked.runId)
  if (!run) throw new Error(`Project ${project.id} has no run ${asked.runId}.`)
  const against = asked.againstRunId ? await findRun(db, project.id, asked.againstRunId) : undefined
  const inputs = await caseInputs(db, project)
  const rows = async <Body>(kind: string) => held(await listRows<Body>(db, project.id, kind))
  const [basis] = await rows<Basis>('basis')
  const [image] = await rows<PlanImage>('plan image')
  const imageFile = image && (await findFile(db, project.id, image.fileId))
  const date = asked.fitDate ?? (await dayOfLastReading(db, project))
  const fit = await fitOf(db, project, run, { date })
  const unit = project.units.length
  return {
    format: 'lavant-package',
    version: 1,
    project: {
      number: project.number,
      title: project.title,
      client: project.client,
      calcReference: project.calcReference,
      crsEpsg: project.crsEpsg,
      verticalDatum: project.verticalDatum,
      timeZone: project.timeZone,
      units: project.units,
    },
    basis: basis ?? null,
    assumptions: await rows<Assumption>('assumption'),
    standards: await rows<Standard>('standard'),
    materials: held(inputs.materials),
    zones: held(inputs.zones),
    points: held(inputs.points),
    planImage: image && imageFile ? { ...image, sha256: imageFile.sha256 } : null,
    wells: held(inputs.wells),
    rechargeZones: held(inputs.rechargeZones),
    boundaries: held(inputs.boundaries),
    walls: held(inputs.walls),
    run: await gatheredRun(db, run),
    against: against ? await gatheredRun(db, against) : null,
    instruments: await gatheredInstruments(db, project),
    imports: (await listImports(db, project.id))
      .filter((record) => record.state === 'committed' && record.receipt && record.committedAt)
      .map((record) => ({
        file: record.file.name,
        sha256: record.file.sha256,
        rows: record.receipt?.counts.rows ?? 0,
        added: record.receipt?.counts.accepted ?? 0,
        committedAt: record.committedAt?.toISOString() ?? '',
        by: record.committedBy ?? '',
      })),
    fit: {
      date,
      lines: fit.lines.map((line) => ({
        name: line.name,
        at: line.lastAt,
        measured: inProjectUnit(line.measured, unit),
        modelled: inProjectUnit(line.modelled, unit),
        residual: inProjectUnit(line.residual, unit),
        why: line.why,
      })),
      statistics: fit.statistics,
    },
    estimates: await rows<Estimate>('estimate'),
  }
}

function held<Body>(rows: readonly { id: string; body: Body }[]): Held<Body>[] {
  return rows.map(({ id, body }) => ({ ...body, id }))
}

async function gatheredRun(db: Database, run: Run): Promise<GatheredRun> {
  if (!run.result || !run.headsSha256) throw new Error(`Run ${run.number} has no result.`)
  return {
    number: run.number,
    caseName: run.caseName,
    inputSha256: run.inputSha256,
    headsSha256: run.headsSha256,
    by: run.by,
    startedAt: (run.startedAt ?? run.createdAt).toISOString(),
    endedAt: (run.endedAt ?? run.createdAt).toISOString(),
    model: run.model,
    result: run.result,
    acceptances: await acceptancesOf(db, run.projectId, run.id),
  }
}

async function gatheredInstruments(db: Database, project: Project): Promise<GatheredContent['instruments']> {
  const levels = held(await listRows<ReferenceLevel>(db, project.id, 'reference level'))
  const last = new Map((await lastReadings(db, project.id)).map((line) => [line.instrumentId, line]))
  const spans = await firstAndLast(db, project.id)
  return held(await listRows<Instrument>(db, project.id, 'instrument')).map((instrument) => ({
    ...instrument,
    referenceLevels: levels.filter((level) => level.instrumentId === instrument.id),
    readings: last.get(instrument.id)?.count ?? 0,
    first: spans.get(instrument.id)?.first ?? null,
    last: spans.get(instrument.id)?.last ?? null,
    lastHead: inProjectUnit(last.get(instrument.id)?.lastHead?.head ?? null, project.units.length),
  }))
}
