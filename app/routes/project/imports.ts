import { Readable } from 'node:stream'
import type { ReadableStream } from 'node:stream/web'
import { TooLarge } from '~/files/files.server'
import { permit } from '~/projects/guard.server'
import { ImportRefused, openImport, uploadLimit } from '~/readings/imports.server'
import { requireSameOrigin } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/imports'

function refusal(status: number, error: string): Response {
  return Response.json({ error }, { status })
}

/** Files are stored here by POST; the imports themselves are on the page of section 6. */
export function loader(): never {
  throw refusal(405, 'Files of readings are sent by POST.')
}

/**
 * Stores a file of readings as it comes: the raw body, its name in X-File-Name (URL-encoded).
 * Answers 201 with { importId }, 400 for an empty file or one that is no text, 413 past 200 MB, 415 for a form.
 */
export async function action({ request, context }: Route.ActionArgs) {
  requireSameOrigin(request)
  const { project, user } = permit(context, 'import', 'readings')
  if (request.method !== 'POST') return refusal(405, 'Files of readings are sent by POST.')
  const type = request.headers.get('content-type')?.split(';')[0] ?? ''
  if (type !== 'text/csv' && type !== 'application/octet-stream') {
    return refusal(415, 'Send the file itself, as text/csv or application/octet-stream.')
  }
  const name = fileName(request.headers.get('x-file-name'))
  if (!name) return refusal(400, 'The file has no name: give it in X-File-Name, URL-encoded.')
  if (Number(request.headers.get('content-length') ?? 0) > uploadLimit) {
    return refusal(413, new TooLarge(uploadLimit).message)
  }
  const body = request.body ? Readable.fromWeb(request.body as ReadableStream) : Readable.from([])
  try {
    const importId = await openImport(database(), { projectId: project.id, userId: user.userId, name, body })
    return Response.json({ importId }, { status: 201 })
  } catch (error) {
    if (error instanceof TooLarge) return refusal(413, error.message)
    if (error instanceof ImportRefused) return refusal(400, error.message)
    if (request.signal.aborted) return refusal(400, 'The upload was broken off: nothing was stored.')
    throw error
  }
}

/** The name without its folders and control characters; null when there is none. */
function fileName(encoded: string | null): string | null {
  if (!encoded) return null
  try {
    const name = decodeURIComponent(encoded).split(/[\\/]/).at(-1) ?? ''
    return (
      name
        .replace(/\p{Cc}/gu, '')
        .trim()
        .slice(0, 255) || null
    )
  } catch (error) {
    if (error instanceof URIError) return null
    throw error
  }
}
