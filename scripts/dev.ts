import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { createServer } from 'vite'
import { environment } from '../app/environment.server.ts'
import { markInterruptedJobs } from '../app/jobs/jobs.server.ts'
import { connectDatabase, disconnectDatabase } from '../database/connection.server.ts'
import { compileKernels } from './compile-kernels.ts'
import { runUnderParent } from './services/under-parent.ts'

/** The development server in the place of scripts/serve.ts: sources are read as they change, nothing is built. */
const { host, port, database } = environment()
connectDatabase(database)
await markInterruptedJobs()
await disconnectDatabase()
const root = dirname(dirname(fileURLToPath(import.meta.url)))
await compileKernels(join(root, '.data/kernels'))
const server = await createServer({
  root,
  mode: 'development',
  server: { host, port, strictPort: true },
  clearScreen: false,
})
await server.listen()
runUnderParent(() => server.close())
