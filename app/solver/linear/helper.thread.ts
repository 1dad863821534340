import { parentPort } from 'node:worker_threads'
import { type HelperTask, help } from './team'

const port = parentPort
if (!port) throw new Error('helper.thread.ts runs on a worker thread only')
port.on('message', (task: HelperTask) => help(task))
