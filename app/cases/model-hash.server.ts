import { createHash } from 'node:crypto'
import canonicalize from 'canonicalize'

/** "sha256:…": the SHA-256 of the model's RFC 8785 canonical form, whatever order its fields were written in. */
export function modelHash(model: unknown): string {
  const canonical = canonicalize(model)
  if (canonical === undefined) throw new TypeError('a model that is not JSON has no hash')
  return `sha256:${createHash('sha256').update(canonical, 'utf8').digest('hex')}`
}
