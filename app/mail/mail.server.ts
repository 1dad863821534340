import { createTransport, type Transporter } from 'nodemailer'
import { environment } from '~/environment.server'

let transporter: Transporter | undefined

function connection(): Transporter {
  const { host, port, user, password, secure } = environment().smtp
  transporter ??= createTransport({
    host,
    port,
    secure,
    auth: user ? { user, pass: password } : undefined,
    ignoreTLS: environment().mode === 'demo',
    connectionTimeout: 10_000,
    greetingTimeout: 10_000,
    socketTimeout: 20_000,
  })
  return transporter
}

/** Sends one plain-text mail. Throws when the mail server refuses it or does not answer. */
export async function sendMail(mail: { to: string; subject: string; text: string }): Promise<void> {
  await connection().sendMail({ from: environment().smtp.from, ...mail })
}
