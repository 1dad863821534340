import { parentPort, workerData } from 'node:worker_threads'
import { drawPackage } from './draw'
import type { DrawRequest } from './gathered'

if (!parentPort) throw new Error('This module is the entry of a worker thread.')
const port = parentPort

const pdf = await drawPackage((workerData as { request: DrawRequest }).request)
const bytes = new Uint8Array(pdf.byteLength)
bytes.set(pdf)
port.postMessage({ kind: 'done', pdf: bytes.buffer }, [bytes.buffer])
