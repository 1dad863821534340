/**
 * Starts a thread from its TypeScript source, in development and tests; `--import tsx` has no effect on threads.
 * The only argument is the source's path.
 */
import { pathToFileURL } from 'node:url'
import { tsImport } from 'tsx/esm/api'

const source = process.argv[2]
if (!source) throw new Error('Which thread?')
await tsImport(pathToFileURL(source).href, import.meta.url)
