import { execFile } from 'node:child_process'
import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { promisify } from 'node:util'
import { createRequestHandler, RouterContextProvider, type ServerBuild } from 'react-router'
import { isBuildCurrent } from '../../scripts/services/build-stamp.ts'

const root = join(import.meta.dirname, '../..')

export type Application = (path: string, init?: RequestInit) => Promise<Response>

/**
 * The application as it is built, without a web server in front: builds it first when the build is not of these
 * sources. It reads the environment as it is at this call, so a test sets its variables (and its database) before.
 */
export async function builtApplication(): Promise<Application> {
  if (!isBuildCurrent(root)) {
    await promisify(execFile)(process.execPath, ['--import', 'tsx', join(root, 'scripts/build.ts')], {
      cwd: root,
      env: { ...process.env, NODE_ENV: 'production', VITEST: '' },
    })
  }
  const build = (await import(pathToFileURL(join(root, 'build/server/index.js')).href)) as ServerBuild
  const handle = createRequestHandler(build, 'production')
  return (path, init) =>
    handle(new Request(new URL(path, process.env.LAVANT_ADDRESS), init), new RouterContextProvider())
}
