import { utils, write } from '@e965/xlsx'
import { safeCell, toCsv } from '~/components/spreadsheet'
import { downloadHeaders } from '~/files/files.server'
import { inProjectUnit, spanFrom } from '~/fit/fit'
import { fitOf } from '~/fit/fit.server'
import { fitTable } from '~/fit/fit-table'
import { findRun } from '~/heads/runs.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/fit-download'

const spreadsheetType = 'application/vnd.openxmlformats-officedocument.spreadsheetml.sheet'

/** The fit sheet as CSV or XLSX (`format`), for the run and span of the page's address. */
export async function loader({ context, request }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const db = database()
  const search = new URL(request.url).searchParams
  const run = await findRun(db, project.id, idFrom(search.get('run') ?? undefined))
  if (run?.state !== 'done') throw notFound()
  const { span, problem } = spanFrom(search)
  if (!span) throw new Response(problem ?? 'Choose the day or the window of the readings.', { status: 400 })
  const unit = project.units.length
  const fit = await fitOf(db, project, run, span)
  const table = fitTable(
    fit.lines.map((line) => ({
      ...line,
      measured: inProjectUnit(line.measured, unit),
      modelled: inProjectUnit(line.modelled, unit),
      residual: inProjectUnit(line.residual, unit),
    })),
    unit,
  )
  const name = `${project.calcReference} fit run ${run.number} ${Object.values(span).join(' to ')}`
  if (search.get('format') === 'xlsx') {
    const sheet = utils.aoa_to_sheet(
      table.map((row) => row.map((cell) => (typeof cell === 'string' ? safeCell(cell) : cell))),
    )
    const workbook = utils.book_new()
    utils.book_append_sheet(workbook, sheet, 'Fit')
    const bytes = new Uint8Array(write(workbook, { type: 'buffer', bookType: 'xlsx' }) as Buffer)
    return new Response(bytes, {
      headers: downloadHeaders({ name: `${name}.xlsx`, content_type: spreadsheetType }),
    })
  }
  return new Response(toCsv(table), {
    headers: downloadHeaders({ name: `${name}.csv`, content_type: 'text/csv; charset=utf-8' }),
  })
}
