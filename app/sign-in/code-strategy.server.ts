import { Authenticator } from 'remix-auth'
import { TOTPStrategy } from 'remix-auth-totp'
import { environment } from '~/environment.server'

/** Seconds for which a code can be used. */
export const codePeriod = 600

const page = '/sign-in/code'

/**
 * remix-auth-totp makes the codes and confirms them; it decides nothing alone. Its own cookie is not signed, not bound
 * to the e-mail, not counted and not consumed, so the browser never gets it: it travels inside our signed cookie, and
 * the record in sign_in_codes is the authority (codes.server.ts). Its links are never sent: they are built from the
 * address of the request, which a forged Host header could choose.
 */
function authenticatorOf(heard: { onCode?: (code: string) => void; onConfirmed?: (email: string) => void }) {
  return new Authenticator<string>().use(
    new TOTPStrategy<string>(
      {
        secret: environment().codeSecret,
        totpGeneration: { period: codePeriod, digits: 6, charSet: '0123456789' },
        emailSentRedirect: page,
        successRedirect: '/',
        failureRedirect: page,
        sendTOTP: async ({ code }) => heard.onCode?.(code),
      },
      async ({ email }) => {
        heard.onConfirmed?.(email)
        return email
      },
    ),
    'code',
  )
}

/** The strategy answers with a redirect, thrown; anything else is a fault. */
async function redirectOf(answer: Promise<unknown>): Promise<Response> {
  try {
    await answer
  } catch (thrown) {
    if (thrown instanceof Response) return thrown
    throw thrown
  }
  throw new Error('The sign-in strategy gave no answer.')
}

function formRequest(fields: Record<string, string>, cookie?: string): Request {
  return new Request(new URL(page, environment().address), {
    method: 'POST',
    body: new URLSearchParams(fields),
    headers: cookie ? { cookie } : {},
  })
}

/** A new six-figure code for an e-mail, with the sealed text that confirms it later. */
export async function makeCode(email: string): Promise<{ code: string; sealed: string }> {
  let code: string | undefined
  const authenticator = authenticatorOf({
    onCode: (made) => {
      code = made
    },
  })
  const response = await redirectOf(authenticator.authenticate('code', formRequest({ email })))
  const sealed = response.headers.getSetCookie()[0]?.split(';')[0]
  if (code === undefined || !sealed) throw new Error('The sign-in strategy made no code.')
  return { code, sealed }
}

/** Whether the sealed text belongs to this code and this e-mail, and is no older than the period. */
export async function confirmCode(email: string, code: string, sealed: string): Promise<boolean> {
  let confirmed: string | undefined
  const authenticator = authenticatorOf({
    onConfirmed: (of) => {
      confirmed = of
    },
  })
  await redirectOf(authenticator.authenticate('code', formRequest({ code }, sealed)))
  return confirmed === email
}
