import type { Grid } from './grid'

/**
 * What crosses a thread or is stored: one buffer, little-endian.
 *
 *   bytes 0..7    "LAVHEADS"
 *   8..11         version, 1 (unsigned 32 bits)
 *   12..15        columns
 *   16..19        rows
 *   20..23        0
 *   24..          columns + 1 edges along x, rows + 1 edges along y, columns x rows heads, row by row from the lowest y,
 *                 each a 64-bit float in the model's length; NaN where there is no ground
 */
export interface HeadsBuffer {
  grid: Grid
  heads: Float64Array
}

const magic = 'LAVHEADS'
const version = 1
const headerBytes = 24

/**
 * One buffer of a head field: header, edges along x and y, then heads by row from the lowest y, all in the model's
 * length, NaN where there is none. Throws RangeError when the heads do not fit the grid.
 */
export function encodeHeads(grid: Grid, heads: Float64Array): ArrayBuffer {
  const { columns, rows, xEdges, yEdges } = grid
  if (heads.length !== columns * rows) {
    throw new RangeError(`${heads.length} heads do not fit ${columns} x ${rows} cells`)
  }
  const count = xEdges.length + yEdges.length + heads.length
  const buffer = new ArrayBuffer(headerBytes + 8 * count)
  const view = new DataView(buffer)
  for (let k = 0; k < magic.length; k++) view.setUint8(k, magic.charCodeAt(k))
  view.setUint32(8, version, true)
  view.setUint32(12, columns, true)
  view.setUint32(16, rows, true)
  let at = headerBytes
  for (const values of [xEdges, yEdges, heads]) {
    for (let k = 0; k < values.length; k++) {
      view.setFloat64(at, values[k] as number, true)
      at += 8
    }
  }
  return buffer
}

/** Reads the buffer back. Throws RangeError when it is not one, of another version, cut short, or its edges do not rise. */
export function decodeHeads(source: ArrayBuffer | Uint8Array): HeadsBuffer {
  const view =
    source instanceof Uint8Array
      ? new DataView(source.buffer, source.byteOffset, source.byteLength)
      : new DataView(source)
  if (view.byteLength < headerBytes) throw new RangeError('the heads buffer is cut short')
  for (let k = 0; k < magic.length; k++) {
    if (view.getUint8(k) !== magic.charCodeAt(k)) throw new RangeError('this is not a heads buffer')
  }
  const found = view.getUint32(8, true)
  if (found !== version)
    throw new RangeError(`the heads buffer has version ${found}; this reads version ${version}`)
  const columns = view.getUint32(12, true)
  const rows = view.getUint32(16, true)
  const expected = headerBytes + 8 * (columns + 1 + rows + 1 + columns * rows)
  if (columns < 1 || rows < 1 || view.byteLength !== expected) {
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
  const xEdges = read(columns + 1)
  const yEdges = read(rows + 1)
  for (const edges of [xEdges, yEdges]) {
    for (let k = 1; k < edges.length; k++) {
      if (!((edges[k] as number) > (edges[k - 1] as number)))
        throw new RangeError('the edges in the heads buffer do not rise')
    }
  }
  return { grid: { columns, rows, xEdges, yEdges }, heads: read(columns * rows) }
}
