import { environment } from '~/environment.server'
import type { Database } from '~database/connection.server'
import { consumeCode, sendCode } from './codes.server'
import { startSession } from './sessions.server'
import { findActiveUser } from './users.server'

/** What a code for signing in is bound to. */
export const signInPurpose = 'sign in'

/**
 * Sends a sign-in code to an e-mail, if it belongs to somebody who may sign in; the answer is the same if not.
 * Returns the Set-Cookie header, or the seconds to wait.
 */
export async function askForSignIn(
  db: Database,
  email: string,
  clientAddress: string,
): Promise<{ cookie: string } | { waitSeconds: number }> {
  return sendCode(db, {
    email,
    purpose: signInPurpose,
    clientAddress,
    known: (await findActiveUser(db, email)) !== undefined,
    mail: (code) => ({
      subject: `${code} is your code for Lavant`,
      text: [
        `Your code to sign in to Lavant: ${code}`,
        '',
        'It works once, for ten minutes, in the browser that asked for it.',
        'If that was not you, do nothing: without the code nobody can sign in.',
        '',
        environment().address,
      ].join('\n'),
    }),
  })
}

/**
 * Signs a browser in with a code. Returns the Set-Cookie headers (session, and the used code's removal), or why not.
 */
export async function signInWithCode(
  db: Database,
  options: { request: Request; code: string; clientAddress: string },
): Promise<{ cookies: string[] } | { reason: 'wrong' | 'ended' | 'too many'; waitSeconds?: number }> {
  const answer = await consumeCode(db, { ...options, purpose: signInPurpose })
  if (!answer.ok) return answer
  const userId = await findActiveUser(db, answer.email)
  // Nobody was mailed this code, or the person left in the meantime.
  if (userId === undefined) return { reason: 'wrong' }
  return { cookies: [await startSession(db, userId, options.request), answer.cookie] }
}
