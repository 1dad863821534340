import type { Grid } from './grid'
import type { HeadField } from './solve'

/**
 * What crosses a thread or is stored: one buffer, little-endian.
 *
 *   bytes 0..7    "LAVHEADS"
 *   8..11         version: 1, one head field (steady flow), or 2, several with their times (unsigned 32 bits)
 *   12..15        columns
 *   16..19        rows
 *   20..23        version 1: 0; version 2: fields, 1 or more
 *   24..          version 2: the time of each field, in the model's unit, rising; then in both columns + 1 edges along x,
 *                 rows + 1 edges along y, and for each field columns x rows heads, row by row from the lowest y. All are
 *                 64-bit floats, lengths and heads in the model's length; NaN where there is no ground
 */
export interface HeadsBuffer {
  grid: Grid
  /** In transient flow those of the last field. */
  heads: Float64Array
  /** Transient flow: every field with its time, from the initial heads on. Steady flow: empty. */
  fields: HeadField[]
}

const magic = 'LAVHEADS'
const headerBytes = 24

/**
 * One buffer of a head field, or of several with their times: header, times, edges along x and y, then heads by row
 * from the lowest y, all in the model's units, NaN where there is none. Throws RangeError when the heads do not fit the
 * grid or the times do not rise.
 */
export function encodeHeads(grid: Grid, content: Float64Array | readonly HeadField[]): ArrayBuffer {
  const { columns, rows, xEdges, yEdges } = grid
  const steady = content instanceof Float64Array
  const fields = steady ? [content] : content.map(({ heads }) => heads)
  const times = steady ? new Float64Array(0) : Float64Array.from(content, ({ time }) => time)
  if (fields.length === 0) throw new RangeError('there are no heads to write')
  for (const heads of fields) {
    if (heads.length !== columns * rows)
      throw new RangeError(`${heads.length} heads do not fit ${columns} x ${rows} cells`)
  }
  if (!rises(times)) throw new RangeError('the times of the heads do not rise')
  const count = times.length + xEdges.length + yEdges.length + fields.length * columns * rows
  const buffer = new ArrayBuffer(headerBytes + 8 * count)
  const view = new DataView(buffer)
  for (let k = 0; k < magic.length; k++) view.setUint8(k, magic.charCodeAt(k))
  view.setUint32(8, steady ? 1 : 2, true)
  view.setUint32(12, columns, true)
  view.setUint32(16, rows, true)
  view.setUint32(20, times.length, true)
  let at = headerBytes
  for (const values of [times, xEdges, yEdges, ...fields]) {
    for (let k = 0; k < values.length; k++) {
      view.setFloat64(at, values[k] as number, true)
      at += 8
    }
  }
  return buffer
}

function rises(values: Float64Array): boolean {
  for (let k = 1; k < values.length; k++) {
    if (!((values[k] as number) > (values[k - 1] as number))) return false
  }
  return true
}

/**
 * Reads a buffer of either version back. Throws RangeError when it is not one, of another version, cut short, or its
 * edges or times do not rise.
 */
export function decodeHeads(source: ArrayBuffer | Uint8Array): HeadsBuffer {
  const view =
    source instanceof Uint8Array
      ? new DataView(source.buffer, source.byteOffset, source.byteLength)
      : new DataView(source)
  if (view.byteLength < headerBytes) throw new RangeError('the heads buffer is cut short')
  for (let k = 0; k < magic.length; k++) {
    if (view.getUint8(k) !== magic.charCodeAt(k)) throw new RangeError('this is not a heads buffer')
  }
  const version = view.getUint32(8, true)
  if (version !== 1 && version !== 2)
    throw new RangeError(`the heads buffer has version ${version}; this reads versions 1 and 2`)
  const columns = view.getUint32(12, true)
  const rows = view.getUint32(16, true)
  const timed = version === 2 ? view.getUint32(20, true) : 0
  const fieldCount = version === 2 ? timed : 1
  const expected = headerBytes + 8 * (timed + columns + 1 + rows + 1 + fieldCount * columns * rows)
  if (columns < 1 || rows < 1 || fieldCount < 1 || view.byteLength !== expected) {
    throw new RangeError(`the heads buffer has ${view.byteLength} bytes where ${expected} belong`)
  }
  let at = headerBytes
  function read(count: number): Float64Array {
    const values = new Float64Array(count)
    for (let k = 0; k < count; k++) {
      values[k] = view.getFloat64(at, true)
      at += 8
    }
    return values
  }
  const times = read(timed)
  const xEdges = read(columns + 1)
  const yEdges = read(rows + 1)
  if (!rises(xEdges) || !rises(yEdges)) throw new RangeError('the edges in the heads buffer do not rise')
  if (!rises(times)) throw new RangeError('the times in the heads buffer do not rise')
  const grid = { columns, rows, xEdges, yEdges }
  if (version === 1) return { grid, heads: read(columns * rows), fields: [] }
  const fields = Array.from(times, (time) => ({ time, heads: read(columns * rows) }))
  return { grid, heads: (fields.at(-1) as HeadField).heads, fields }
}
