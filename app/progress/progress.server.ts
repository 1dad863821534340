import { inProjectUnit } from '~/fit/fit'
import { issuedContent, listPackages } from '~/packages/packages.server'
import { levelUnit, type Project } from '~/projects/project'
import { lastReadings } from '~/readings/readings.server'
import type { Database } from '~database/connection.server'
import type { IssuedDocument, ProgressView } from './progress'

/** Gathers what a client may see, field by field: nothing is spread from a stored object. */
export async function progressView(db: Database, project: Project): Promise<ProgressView> {
  const [packages, readings, issued] = await Promise.all([
    listPackages(db, project.id),
    lastReadings(db, project.id),
    issuedContent(db, project.id),
  ])
  const unit = project.units.length
  const predicted = new Map(issued?.fit.lines.map((line) => [line.name, line.modelled]))
  return {
    project: {
      number: project.number,
      title: project.title,
      client: project.client,
      unit,
      levels: levelUnit(unit, project.verticalDatum),
      timeZone: project.timeZone,
    },
    stage: project.stage,
    nextStep: project.nextStep,
    issued: packages.flatMap((line): IssuedDocument[] =>
      (line.status === 'issued' || line.status === 'superseded') && line.issuedAt && line.pdfSha256
        ? [
            {
              id: line.id,
              revision: line.revision,
              status: line.status,
              purpose: line.purpose,
              issuedAt: line.issuedAt,
              sha256: line.pdfSha256,
            },
          ]
        : [],
    ),
    instruments: readings.map((reading) => ({
      name: reading.name,
      outOfService: reading.outOfService,
      head: inProjectUnit(reading.lastHead?.head ?? null, unit),
      headAt: reading.lastHead?.at ?? null,
      at: reading.last?.at ?? null,
      status: reading.last?.status ?? null,
      quality: reading.last?.quality ?? null,
      predicted: predicted.get(reading.name) ?? null,
    })),
    fit:
      issued?.fit.statistics && issued.fit.date
        ? {
            day: issued.fit.date,
            n: issued.fit.statistics.n,
            typical: issued.fit.statistics.mae,
            largest: Math.abs(issued.fit.statistics.largest),
          }
        : null,
  }
}
