import { database } from '~database/connection.server'

/** For whatever watches the server: 200 while the database answers. */
export async function loader() {
  try {
    await database().raw('select 1')
    return Response.json({ ok: true }, { headers: { 'Cache-Control': 'no-store' } })
  } catch (error) {
    console.error('The database does not answer:', error)
    return Response.json({ ok: false }, { status: 503, headers: { 'Cache-Control': 'no-store' } })
  }
}
