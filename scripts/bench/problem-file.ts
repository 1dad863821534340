import { readFileSync, writeFileSync } from 'node:fs'
import { basename } from 'node:path'
import type { Problem } from './problems.ts'

/**
 * Problem files, little endian: int32 columns, int32 rows, then doubles row by row: links east, links north, links to
 * what is held, right-hand side. Throws when the length does not fit.
 */
export function readProblem(path: string): Problem {
  const bytes = readFileSync(path)
  const columns = bytes.length >= 8 ? bytes.readInt32LE(0) : 0
  const rows = bytes.length >= 8 ? bytes.readInt32LE(4) : 0
  const count = columns * rows
  if (!(columns > 0 && rows > 0) || bytes.length !== 8 + 32 * count) {
    throw new Error(
      `${path} is not a problem file: ${bytes.length} bytes do not fit ${columns} x ${rows} cells.`,
    )
  }
  const numbers = bytes.buffer.slice(bytes.byteOffset + 8, bytes.byteOffset + bytes.length)
  const array = (k: number) => new Float64Array(numbers, k * 8 * count, count)
  return {
    name: basename(path).replace(/\.[^.]*$/, ''),
    columns,
    rows,
    east: array(0),
    north: array(1),
    own: array(2),
    b: array(3),
  }
}

export function writeProblem(path: string, { columns, rows, east, north, own, b }: Problem): void {
  const head = Buffer.alloc(8)
  head.writeInt32LE(columns, 0)
  head.writeInt32LE(rows, 4)
  const arrays = [east, north, own, b].map((values) =>
    Buffer.from(values.buffer, values.byteOffset, values.byteLength),
  )
  writeFileSync(path, Buffer.concat([head, ...arrays]))
}
