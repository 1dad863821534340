import { z } from 'zod'

const port = z.coerce.number().int().min(1).max(65535)
const secret = z.string().regex(/^[0-9a-f]{64}$/, 'must be 64 hexadecimal characters')
const flag = z.enum(['true', 'false']).transform((text) => text === 'true')

/** Every environment variable that the application reads, and what it is for. */
const variables = z.object({
  LAVANT_MODE: z
    .enum(['demo', 'production'])
    .describe('demo: invented data and local stand-ins; production: neither'),
  LAVANT_HOST: z.string().default('127.0.0.1').describe('address the web server listens on'),
  LAVANT_PORT: port.default(3000).describe('port the web server listens on'),
  LAVANT_ADDRESS: z.url().describe('public address, the only one that mails and PDFs print'),
  LAVANT_TRUSTED_PROXIES: z.coerce
    .number()
    .int()
    .min(0)
    .default(0)
    .describe('proxies in front whose forwarded address is believed'),
  LAVANT_DATABASE_HOST: z.string(),
  LAVANT_DATABASE_PORT: port.default(3306),
  LAVANT_DATABASE_NAME: z.string(),
  LAVANT_DATABASE_USER: z.string(),
  LAVANT_DATABASE_PASSWORD: z.string(),
  LAVANT_S3_ENDPOINT: z.url().describe('S3 or a compatible service'),
  LAVANT_S3_REGION: z.string().default('eu-west-2'),
  LAVANT_S3_BUCKET: z.string(),
  LAVANT_S3_ACCESS_KEY: z.string(),
  LAVANT_S3_SECRET_KEY: z.string(),
  LAVANT_SMTP_HOST: z.string(),
  LAVANT_SMTP_PORT: port,
  LAVANT_SMTP_USER: z.string().optional(),
  LAVANT_SMTP_PASSWORD: z.string().optional(),
  LAVANT_SMTP_SECURE: flag.default(false).describe('TLS from the first byte'),
  LAVANT_MAIL_FROM: z.string().describe('sender of every mail'),
  LAVANT_SESSION_SECRET: secret.describe('signs cookies'),
  LAVANT_CODE_SECRET: secret.describe('encrypts the sign-in flow and keys the hashes of codes'),
  LAVANT_MAILBOX: z
    .string()
    .optional()
    .describe('demo only: folder in which the SMTP stand-in keeps received mail'),
})

export interface Environment {
  mode: 'demo' | 'production'
  host: string
  port: number
  address: string
  trustedProxies: number
  database: { host: string; port: number; name: string; user: string; password: string }
  s3: { endpoint: string; region: string; bucket: string; accessKey: string; secretKey: string }
  smtp: { host: string; port: number; user?: string; password?: string; secure: boolean; from: string }
  sessionSecret: string
  codeSecret: string
  mailbox?: string
}

const loopback = new Set(['127.0.0.1', 'localhost', '::1', '[::1]'])

/**
 * Reads and checks the variables.
 * Throws an Error that names each missing or wrong variable; in demo mode also when an address or a service
 * is not on this machine, since the demo's sign-in codes can be read by anybody who reaches it.
 */
export function parseEnvironment(source: Record<string, string | undefined>): Environment {
  const filled = Object.fromEntries(Object.entries(source).filter(([, value]) => value !== ''))
  const parsed = variables.safeParse(filled)
  if (!parsed.success) {
    const lines = parsed.error.issues.map((issue) => {
      const name = issue.path.join('.')
      return `  ${name}: ${source[name] ? issue.message : 'is missing'}`
    })
    throw new Error(`Lavant cannot start; these environment variables need a value:\n${lines.join('\n')}`)
  }
  const v = parsed.data
  if (v.LAVANT_MODE === 'demo') {
    const places: [string, string][] = [
      ['LAVANT_HOST', v.LAVANT_HOST],
      ['LAVANT_ADDRESS', new URL(v.LAVANT_ADDRESS).hostname],
      ['LAVANT_DATABASE_HOST', v.LAVANT_DATABASE_HOST],
      ['LAVANT_S3_ENDPOINT', new URL(v.LAVANT_S3_ENDPOINT).hostname],
      ['LAVANT_SMTP_HOST', v.LAVANT_SMTP_HOST],
    ]
    const outside = places.filter(([, host]) => !loopback.has(host))
    if (outside.length > 0) {
      const lines = outside.map(([name, host]) => `  ${name}: ${host} is not this machine`)
      throw new Error(`The demo runs on this machine only (LAVANT_MODE=demo):\n${lines.join('\n')}`)
    }
  } else if (v.LAVANT_MAILBOX) {
    throw new Error('LAVANT_MAILBOX belongs to the demo: leave it out in production.')
  }
  return {
    mode: v.LAVANT_MODE,
    host: v.LAVANT_HOST,
    port: v.LAVANT_PORT,
    address: v.LAVANT_ADDRESS.replace(/\/+$/, ''),
    trustedProxies: v.LAVANT_TRUSTED_PROXIES,
    database: {
      host: v.LAVANT_DATABASE_HOST,
      port: v.LAVANT_DATABASE_PORT,
      name: v.LAVANT_DATABASE_NAME,
      user: v.LAVANT_DATABASE_USER,
      password: v.LAVANT_DATABASE_PASSWORD,
    },
    s3: {
      endpoint: v.LAVANT_S3_ENDPOINT,
      region: v.LAVANT_S3_REGION,
      bucket: v.LAVANT_S3_BUCKET,
      accessKey: v.LAVANT_S3_ACCESS_KEY,
      secretKey: v.LAVANT_S3_SECRET_KEY,
    },
    smtp: {
      host: v.LAVANT_SMTP_HOST,
      port: v.LAVANT_SMTP_PORT,
      user: v.LAVANT_SMTP_USER,
      password: v.LAVANT_SMTP_PASSWORD,
      secure: v.LAVANT_SMTP_SECURE,
      from: v.LAVANT_MAIL_FROM,
    },
    sessionSecret: v.LAVANT_SESSION_SECRET,
    codeSecret: v.LAVANT_CODE_SECRET,
    mailbox: v.LAVANT_MAILBOX,
  }
}

let parsedOnce: Environment | undefined

/** The environment of this process, parsed at first use. Throws as parseEnvironment does. */
export function environment(): Environment {
  parsedOnce ??= parseEnvironment(process.env)
  return parsedOnce
}
