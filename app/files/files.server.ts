import { createHash, randomUUID } from 'node:crypto'
import type { Readable } from 'node:stream'
import { Transform } from 'node:stream'
import { DeleteObjectCommand, GetObjectCommand, S3Client } from '@aws-sdk/client-s3'
import { Upload } from '@aws-sdk/lib-storage'
import { environment } from '~/environment.server'
import type { Database } from '~database/connection.server'

let client: S3Client | undefined

function s3(): S3Client {
  const { endpoint, region, accessKey, secretKey } = environment().s3
  client ??= new S3Client({
    endpoint,
    region,
    credentials: { accessKeyId: accessKey, secretAccessKey: secretKey },
    forcePathStyle: true,
    // With the SDK's default checksums a streamed body was stored corrupted by the local stand-in.
    requestChecksumCalculation: 'WHEN_REQUIRED',
    responseChecksumValidation: 'WHEN_REQUIRED',
  })
  return client
}

export interface StoredObject {
  key: string
  bytes: number
  sha256: string
}

export class TooLarge extends Error {
  constructor(readonly limit: number) {
    super(`The file is larger than ${Math.round(limit / 1_048_576)} MB.`)
  }
}

/**
 * Streams a body into S3 under a fresh key, hashing and counting as it goes; nothing is held in memory.
 * Throws TooLarge past `limit` bytes, and leaves no object behind then.
 */
export async function putObject(
  body: Readable,
  options: { folder: string; contentType: string; limit: number },
): Promise<StoredObject> {
  const key = `${options.folder}/${randomUUID()}`
  const hash = createHash('sha256')
  let bytes = 0
  const counted = new Transform({
    transform(chunk: Buffer, _encoding, done) {
      bytes += chunk.length
      if (bytes > options.limit) done(new TooLarge(options.limit))
      else {
        hash.update(chunk)
        done(null, chunk)
      }
    },
  })
  let failure: Error | undefined
  const upload = new Upload({
    client: s3(),
    params: { Bucket: environment().s3.bucket, Key: key, Body: counted, ContentType: options.contentType },
  })
  const fail = (error: Error) => {
    failure ??= error
    counted.destroy(error)
    void upload.abort()
  }
  body.on('error', fail)
  counted.on('error', fail)
  body.pipe(counted)
  try {
    await upload.done()
  } catch (error) {
    body.destroy()
    throw failure ?? error
  }
  if (failure) throw failure
  return { key, bytes, sha256: hash.digest('hex') }
}

/** Stores a buffer under a fresh key. */
export async function putBuffer(
  buffer: Uint8Array,
  options: { folder: string; contentType: string },
): Promise<StoredObject> {
  const key = `${options.folder}/${randomUUID()}`
  const upload = new Upload({
    client: s3(),
    params: { Bucket: environment().s3.bucket, Key: key, Body: buffer, ContentType: options.contentType },
  })
  await upload.done()
  return { key, bytes: buffer.byteLength, sha256: createHash('sha256').update(buffer).digest('hex') }
}

/** The object as a stream. Throws when it is not there. */
export async function getObjectStream(key: string): Promise<Readable> {
  const answer = await s3().send(new GetObjectCommand({ Bucket: environment().s3.bucket, Key: key }))
  if (!answer.Body) throw new Error(`Stored object ${key} has no body.`)
  return answer.Body as Readable
}

/**
 * The object as a stream that ends only if its SHA-256 is the one on record: the last piece is held back until the hash
 * is known, so that a damaged object breaks off instead of arriving whole.
 */
export async function getVerifiedStream(key: string, sha256: string): Promise<Readable> {
  const hash = createHash('sha256')
  let held: Buffer | undefined
  const verified = new Transform({
    transform(chunk: Buffer, _encoding, done) {
      hash.update(chunk)
      const before = held
      held = chunk
      done(null, before)
    },
    flush(done) {
      const found = hash.digest('hex')
      if (found === sha256) done(null, held)
      else done(new Error(`Stored object ${key} is damaged: SHA-256 ${found}, expected ${sha256}.`))
    },
  })
  const object = await getObjectStream(key)
  object.on('error', (error) => verified.destroy(error))
  verified.on('close', () => object.destroy())
  return object.pipe(verified)
}

/** The object whole, its SHA-256 held against the one on record. Throws when they differ. */
export async function getVerified(key: string, sha256: string): Promise<Buffer> {
  const chunks: Buffer[] = []
  for await (const chunk of await getObjectStream(key)) chunks.push(chunk as Buffer)
  const buffer = Buffer.concat(chunks)
  const found = createHash('sha256').update(buffer).digest('hex')
  if (found !== sha256)
    throw new Error(`Stored object ${key} is damaged: SHA-256 ${found}, expected ${sha256}.`)
  return buffer
}

/** Removes an object that no record names, after an upload that came to nothing. */
export async function deleteObject(key: string): Promise<void> {
  await s3().send(new DeleteObjectCommand({ Bucket: environment().s3.bucket, Key: key }))
}

export interface FileRecord {
  id: number
  project_id: number
  kind: string
  name: string
  content_type: string
  bytes: number
  sha256: string
  s3_key: string
  stored_at: Date
  stored_by: number
}

/** Enters a stored object as a file of the project; returns its id. */
export async function recordFile(
  db: Database,
  file: {
    projectId: number
    kind: string
    name: string
    contentType: string
    stored: StoredObject
    userId: number
  },
): Promise<number> {
  const [id] = await db('files').insert({
    project_id: file.projectId,
    kind: file.kind,
    name: file.name.slice(0, 255),
    content_type: file.contentType,
    bytes: file.stored.bytes,
    sha256: file.stored.sha256,
    s3_key: file.stored.key,
    stored_at: new Date(),
    stored_by: file.userId,
  })
  if (id === undefined) throw new Error('The database returned no file id.')
  return id
}

/** A file of this project, or undefined. */
export async function findFile(
  db: Database,
  projectId: number,
  fileId: number,
): Promise<FileRecord | undefined> {
  return db<FileRecord>('files').where({ id: fileId, project_id: projectId }).first()
}

/** Headers for a file that somebody uploaded: a download, never a page of ours. */
export function downloadHeaders(file: { name: string; content_type: string }, inline = false): Headers {
  const plain = file.name.replace(/[^\w.\- ]/g, '_')
  return new Headers({
    'Content-Type': file.content_type,
    'Content-Disposition': `${inline ? 'inline' : 'attachment'}; filename="${plain}"; filename*=UTF-8''${encodeURIComponent(file.name)}`,
    'X-Content-Type-Options': 'nosniff',
    'Content-Security-Policy': "sandbox; default-src 'none'",
    // A browser may keep it but asks each time: somebody else may sit there by then, or the person have left.
    'Cache-Control': 'private, no-cache',
  })
}
