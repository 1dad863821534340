import type { Database } from '~database/connection.server'
import { deleteObject, putBuffer, recordFile, TooLarge } from './files.server'
import { readPictureHeader } from './picture-header'

export const planImageLimits = { bytes: 20 * 1_048_576, pixels: 40_000_000 }

export type PlanImageAnswer =
  | { ok: true; fileId: number; width: number; height: number; contentType: string; sha256: string }
  | { ok: false; status: 413 | 415 | 422; message: string }

/**
 * The whole of a request's body. Throws TooLarge past `limit` bytes, without reading on; whatever the stream throws
 * when the sender goes away.
 */
async function readBody(body: ReadableStream<Uint8Array>, limit: number): Promise<Buffer> {
  const chunks: Uint8Array[] = []
  let bytes = 0
  for await (const chunk of body) {
    bytes += chunk.byteLength
    if (bytes > limit) throw new TooLarge(limit)
    chunks.push(chunk)
  }
  return Buffer.concat(chunks)
}

/**
 * Takes a plan image: a PNG or JPEG by its content, within the limits of bytes and pixels, stored unchanged. What is
 * refused leaves nothing behind.
 */
export async function storePlanImage(
  db: Database,
  upload: { projectId: number; userId: number; name: string; body: ReadableStream<Uint8Array> | null },
): Promise<PlanImageAnswer> {
  let picture: Buffer
  try {
    picture = upload.body ? await readBody(upload.body, planImageLimits.bytes) : Buffer.alloc(0)
  } catch (error) {
    if (error instanceof TooLarge) return { ok: false, status: 413, message: error.message }
    throw error
  }
  const header = readPictureHeader(picture)
  if (!header.ok) return { ok: false, status: header.reason === 'kind' ? 415 : 422, message: header.message }
  const { width, height, contentType } = header
  if (width * height > planImageLimits.pixels) {
    const millions = (width * height) / 1e6
    return {
      ok: false,
      status: 422,
      message: `This picture has ${width} by ${height} pixels, ${millions.toFixed(0)} million; at most ${planImageLimits.pixels / 1e6} million are taken.`,
    }
  }
  const stored = await putBuffer(picture, { folder: `projects/${upload.projectId}/plans`, contentType })
  try {
    const fileId = await recordFile(db, {
      projectId: upload.projectId,
      kind: 'plan image',
      name: upload.name.trim() || `plan.${contentType === 'image/png' ? 'png' : 'jpg'}`,
      contentType,
      stored,
      userId: upload.userId,
    })
    return { ok: true, fileId, width, height, contentType, sha256: stored.sha256 }
  } catch (error) {
    await deleteObject(stored.key)
    throw error
  }
}
