import type { NextFunction, Request, Response } from 'express'

/** Bytes that a form may have; React Router reads a form into memory whole, before anybody is asked to sign in. */
export const mostFormBytes = 1_048_576

/** Routes that read their body piece by piece and count it themselves, written exactly so. */
const counting = /^\/(api\/v1\/solve|projects\/\d+\/(files|rows|readings\/imports))$/

/**
 * Turns away bodies that nobody counts: 413 for one longer than a form may be, 411 for one that does not say its
 * length beforehand. Node lets no body grow past the length it gave.
 */
export function limitBody(request: Request, response: Response, next: NextFunction): void {
  const long = Number(request.headers['content-length'] ?? 0) > mostFormBytes
  const unsaid = request.headers['transfer-encoding'] !== undefined
  if ((!long && !unsaid) || counting.test(request.path)) {
    next()
    return
  }
  // The rest of the body is not read, so the connection can't serve another request.
  response.set('Connection', 'close')
  if (unsaid) response.status(411).type('text').send('Say the length of what you send.')
  else response.status(413).type('text').send('This is too much for one form: 1 MB at most.')
}
