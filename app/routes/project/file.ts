import { createReadableStreamFromReadable } from '@react-router/node'
import { downloadHeaders, findFile, getVerifiedStream } from '~/files/files.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/file'

/** Any file of the project as a download; a plan image may be shown in a page. Clients find nothing here. */
export async function loader({ request, params, context }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const file = await findFile(database(), project.id, idFrom(params.fileId))
  if (!file) throw notFound()
  const inline = file.kind === 'plan image' && /^image\/(png|jpeg)$/.test(file.content_type)
  const headers = downloadHeaders(file, inline)
  headers.set('ETag', `"${file.sha256}"`)
  if (request.headers.get('if-none-match') === `"${file.sha256}"`)
    return new Response(null, { status: 304, headers })
  headers.set('Content-Length', String(file.bytes))
  return new Response(createReadableStreamFromReadable(await getVerifiedStream(file.s3_key, file.sha256)), {
    headers,
  })
}
