import { findRow } from '~/book/rows.server'
import { notFound, permit } from '~/projects/guard.server'
import { seriesOf } from '~/readings/readings.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/series'

const mostPoints = 4000

/**
 * The hydrograph of an instrument as JSON, heads in metres: ?from and ?to are instants in milliseconds since 1970,
 * ?points the most that are wanted. Answers 400 for anything else in them.
 */
export async function loader({ request, context, params }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const db = database()
  if (!(await findRow(db, project.id, 'instrument', params.instrumentId))) throw notFound()
  const query = new URL(request.url).searchParams
  const from = numberIn(query, 'from')
  const to = numberIn(query, 'to')
  const points = Math.min(mostPoints, Math.max(8, numberIn(query, 'points') ?? 1500))
  const series = await seriesOf(db, project.id, params.instrumentId, {
    from: from === undefined ? undefined : new Date(from),
    to: to === undefined ? undefined : new Date(to),
    maxPoints: points,
  })
  return Response.json(series, { headers: { 'Cache-Control': 'private, no-cache' } })
}

function numberIn(query: URLSearchParams, name: string): number | undefined {
  const text = query.get(name)
  if (text === null || text === '') return undefined
  const value = Number(text)
  if (!Number.isFinite(value) || Math.abs(value) > 8.64e15) {
    throw Response.json({ error: `${name} is not a number of milliseconds.` }, { status: 400 })
  }
  return value
}
