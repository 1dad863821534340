import { parentPort } from 'node:worker_threads'
import { help, type SharedTask } from './team'

const port = parentPort
if (!port) throw new Error('second.thread.ts runs on a worker thread only')
port.on('message', (task: SharedTask) => help(task))
