import { type Environment, parseEnvironment } from '../app/environment.server.ts'

/**
 * The services of this test run: real MariaDB, S3 and SMTP, started by scripts/test.js.
 * Throws a message for the developer who runs a single test without them.
 */
export function testServices(): Environment {
  if (!process.env.LAVANT_DATABASE_PORT) {
    throw new Error(
      'This test needs MariaDB and the stand-ins. Run npm test, or keep `node scripts/services.js --data FOLDER` open and source FOLDER/environment.sh.',
    )
  }
  return parseEnvironment(process.env)
}
