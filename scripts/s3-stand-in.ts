import { createServer } from 'node:http'
import S3rver from 's3rver'
import AWSAccount from 's3rver/lib/models/account.js'
import { environment } from '../app/environment.server.ts'
import { closed, listening } from './services/listening.ts'
import { runUnderParent } from './services/under-parent.ts'

/**
 * The demo's object store: the S3 protocol over a folder (first argument), on loopback.
 * It checks no signature, so everything that does not name our random access key is turned away at the door.
 */
const { s3 } = environment()
const folder = process.argv[2]
if (!folder) throw new Error('Give the folder that keeps the objects.')

AWSAccount.DUMMY_ACCOUNT.createKeyPair(s3.accessKey, s3.secretKey)
const store = new S3rver({
  directory: folder,
  silent: true,
  vhostBuckets: false,
  configureBuckets: [{ name: s3.bucket, configs: [] }],
})
await store.configureBuckets()
const answer = store.callback()

const server = createServer((request, response) => {
  // Not decoded: an address that is no proper encoding, which any web page may ask for, must not end this process.
  const named = `${request.headers.authorization ?? ''} ${request.url ?? ''}`.replaceAll('%2F', '/')
  if (!named.includes(`Credential=${s3.accessKey}/`)) {
    response.writeHead(403).end()
    return
  }
  answer(request, response)
})
const { hostname, port } = new URL(s3.endpoint)
await listening(server, Number(port), hostname)
runUnderParent(() => closed(server))
