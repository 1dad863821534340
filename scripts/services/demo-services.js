import { mkdirSync } from 'node:fs'
import { join } from 'node:path'
import { startMariadb } from './mariadb.js'
import { claimPort } from './ports.js'
import { secretsIn } from './secrets.js'

/**
 * The environment variables that point the application at the services of this machine.
 *
 * @param {object} options
 * @param {string} options.folder absolute folder of all data
 * @param {{ web: number, database: number, s3: number, smtp: number }} options.ports
 * @param {string} options.schema
 * @returns {Record<string, string>}
 */
export function demoVariables({ folder, ports, schema }) {
  const secrets = secretsIn(folder)
  return {
    LAVANT_MODE: 'demo',
    LAVANT_HOST: '127.0.0.1',
    LAVANT_PORT: String(ports.web),
    LAVANT_ADDRESS: `http://127.0.0.1:${ports.web}`,
    LAVANT_TRUSTED_PROXIES: '0',
    LAVANT_DATABASE_HOST: '127.0.0.1',
    LAVANT_DATABASE_PORT: String(ports.database),
    LAVANT_DATABASE_NAME: schema,
    LAVANT_DATABASE_USER: 'lavant',
    LAVANT_DATABASE_PASSWORD: secrets.databasePassword,
    LAVANT_S3_ENDPOINT: `http://127.0.0.1:${ports.s3}`,
    LAVANT_S3_REGION: 'eu-west-2',
    LAVANT_S3_BUCKET: 'lavant',
    LAVANT_S3_ACCESS_KEY: secrets.s3AccessKey,
    LAVANT_S3_SECRET_KEY: secrets.s3SecretKey,
    LAVANT_SMTP_HOST: '127.0.0.1',
    LAVANT_SMTP_PORT: String(ports.smtp),
    LAVANT_SMTP_USER: '',
    LAVANT_SMTP_PASSWORD: '',
    LAVANT_SMTP_SECURE: 'false',
    LAVANT_MAIL_FROM: 'Lavant <lavant@mail.invalid>',
    LAVANT_SESSION_SECRET: secrets.sessionSecret,
    LAVANT_CODE_SECRET: secrets.codeSecret,
    LAVANT_MAILBOX: join(folder, 'mailbox'),
    LAVANT_DATA: folder,
  }
}

/**
 * Starts what Lavant needs around it on this machine: MariaDB, the S3 stand-in and the SMTP stand-in.
 *
 * @param {object} options
 * @param {ReturnType<typeof import('./processes.js').createProcesses>} options.processes
 * @param {string} options.root folder of the project
 * @param {string} options.folder absolute folder of all data
 * @param {{ database: number, s3: number, smtp: number }} options.ports
 * @param {Record<string, string>} options.variables of demoVariables
 * @param {boolean} options.throwAway
 */
export async function startDemoServices({ processes, root, folder, ports, variables, throwAway }) {
  const logs = join(folder, 'logs')
  const objects = join(folder, 's3')
  for (const path of [logs, variables.LAVANT_MAILBOX, objects])
    mkdirSync(path, { recursive: true, mode: 0o700 })
  await startMariadb({
    processes,
    folder: join(folder, 'mariadb'),
    log: join(logs, 'database.log'),
    port: ports.database,
    portVariable: 'LAVANT_DATABASE_PORT',
    schema: variables.LAVANT_DATABASE_NAME,
    user: variables.LAVANT_DATABASE_USER,
    secrets: secretsIn(folder),
    throwAway,
  })
  await claimPort(ports.s3, 'LAVANT_S3_PORT', 'the S3 stand-in')
  await claimPort(ports.smtp, 'LAVANT_SMTP_PORT', 'the SMTP stand-in')
  const environment = { ...process.env, ...variables }
  await Promise.all([
    processes.start({
      name: 'The S3 stand-in',
      command: process.execPath,
      // Its list of objects is cut into pages with a hash that OpenSSL 3 counts as legacy.
      arguments: [
        '--openssl-legacy-provider',
        '--import',
        'tsx',
        join(root, 'scripts/s3-stand-in.ts'),
        objects,
      ],
      environment,
      log: join(logs, 's3.log'),
      channel: true,
    }),
    processes.start({
      name: 'The SMTP stand-in',
      command: process.execPath,
      arguments: ['--import', 'tsx', join(root, 'scripts/smtp-stand-in.ts')],
      environment,
      log: join(logs, 'smtp.log'),
      channel: true,
    }),
  ])
}
