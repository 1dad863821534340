/**
 * npm run --silent solve -- model.json [--heads FILE]
 *
 * Solves a model file without database or server. Prints only the result, as JSON, on standard output. Exit codes: 0
 * solved, 2 the file was refused (what and where on standard error), 3 not converged (the result is printed, with
 * "converged": false).
 */
import { readFileSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { parseModelFile } from '~/cases/model-file'
import { modelHash } from '~/cases/model-hash.server'
import { solverKernels } from '~/heads/kernels.server'
import { encodeHeads } from '~/solver/heads-buffer'
import { ModelError } from '~/solver/model-error'
import { solveModel } from '~/solver/solve'
import { compileKernels } from './compile-kernels.ts'

const refused = 2
const notConverged = 3

interface Request {
  file: string
  headsFile: string | null
}

class Refusal extends Error {}

function requestOf(given: string[]): Request {
  let file: string | null = null
  let headsFile: string | null = null
  for (let k = 0; k < given.length; k++) {
    const word = given[k] as string
    if (word === '--heads') {
      headsFile = given[++k] ?? null
      if (headsFile === null) throw new Refusal('--heads needs the name of a file to write')
    } else if (word.startsWith('--')) throw new Refusal(`there is no option ${word}`)
    else if (file === null) file = word
    else throw new Refusal(`one model at a time: what is "${word}"?`)
  }
  if (file === null) throw new Refusal('usage: npm run --silent solve -- model.json [--heads FILE]')
  return { file, headsFile }
}

function readJson(file: string): unknown {
  let text: string
  try {
    text = readFileSync(file, 'utf8')
  } catch (error) {
    throw new Refusal(`${file}: cannot be read (${(error as Error).message})`)
  }
  try {
    return JSON.parse(text)
  } catch (error) {
    throw new Refusal(`${file}: is not JSON (${(error as Error).message})`)
  }
}

function run({ file, headsFile }: Request): number {
  const json = readJson(file)
  const parsed = parseModelFile(json)
  if (!parsed.ok)
    throw new Refusal(parsed.errors.map(({ path, message }) => `${path}: ${message}`).join('\n'))
  const { result, heads, fields, grid } = solveModel(parsed.model, {
    input: modelHash(json),
    kernels: solverKernels(),
  })
  if (headsFile !== null) {
    try {
      writeFileSync(headsFile, new Uint8Array(encodeHeads(grid, fields.length > 0 ? fields : heads)))
    } catch (error) {
      throw new Refusal(`${headsFile}: cannot be written (${(error as Error).message})`)
    }
  }
  process.stdout.write(
    `${JSON.stringify(headsFile === null ? result : { ...result, heads: headsFile }, null, 2)}\n`,
  )
  return result.converged ? 0 : notConverged
}

await compileKernels(join(dirname(dirname(fileURLToPath(import.meta.url))), '.data/kernels'))
try {
  process.exitCode = run(requestOf(process.argv.slice(2)))
} catch (error) {
  if (error instanceof ModelError) process.stderr.write(`${error.path}: ${error.message}\n`)
  else if (error instanceof Refusal) process.stderr.write(`${error.message}\n`)
  else throw error
  process.exitCode = refused
}
