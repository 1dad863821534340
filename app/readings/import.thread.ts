import { parentPort, workerData } from 'node:worker_threads'
import type { Project } from '~/projects/project'
import { connectDatabase, type DatabaseSettings, disconnectDatabase } from '~database/connection.server'
import { UnreadableFile } from './file-rows.server'
import type { ImportSettings } from './import-settings'
import { type CommitOrder, commitImport, ImportRefused } from './imports.server'
import { type Progress, previewFile, Stopped } from './preview.server'

/** Reads or commits one file of readings away from the server's own thread, with a connection of its own. */
interface Preview {
  task: 'preview'
  database: DatabaseSettings
  cancel: Int32Array
  project: Pick<Project, 'id' | 'timeZone' | 'units'>
  importId: number
  file: { key: string; bytes: number }
  settings: ImportSettings
}

interface Commit {
  task: 'commit'
  database: DatabaseSettings
  cancel: Int32Array
  project: { id: number }
  userId: number
  importId: number
  order: CommitOrder
}

function report(progress: Progress): void {
  parentPort?.postMessage({ kind: 'progress', ...progress })
}

async function run(order: Preview | Commit): Promise<unknown> {
  const db = connectDatabase(order.database)
  try {
    if (order.task === 'commit') {
      const { project, userId, importId } = order
      const receipt = await commitImport(db, {
        projectId: project.id,
        userId,
        importId,
        order: order.order,
        report,
      })
      return { kind: 'done', receipt }
    }
    const stopped = () => Atomics.load(order.cancel, 0) !== 0
    const preview = await previewFile(db, { ...order, now: new Date(), report, stopped })
    return { kind: 'done', preview }
  } catch (error) {
    if (error instanceof Stopped) return { kind: 'cancelled' }
    if (error instanceof UnreadableFile || error instanceof ImportRefused) {
      return { kind: 'refused', message: error.message }
    }
    throw error
  } finally {
    await disconnectDatabase()
  }
}

parentPort?.postMessage(await run(workerData as Preview | Commit))
