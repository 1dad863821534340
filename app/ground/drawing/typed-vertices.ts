import type { Vertex } from '~/book/field'

export type TypedVertices = { ok: true; vertices: Vertex[] } | { ok: false; message: string }

/**
 * Reads coordinates as typed or pasted from a spreadsheet: one vertex a line, x then y, parted by a tab, a semicolon,
 * a comma or a space. A decimal comma is understood where a tab or a semicolon parts the two.
 */
export function parseVertices(text: string): TypedVertices {
  const vertices: Vertex[] = []
  for (const [index, raw] of text.split(/\r?\n/).entries()) {
    const line = raw.trim().replace(/−/g, '-')
    if (line === '') continue
    const parts = /[\t;]/.test(line)
      ? line.split(/[\t;]+/).map((part) => part.trim().replace(',', '.'))
      : line.split(/[\s,]+/)
    const [x, y] = parts.map((part) => (/\d/.test(part) ? Number(part) : Number.NaN))
    if (parts.length !== 2 || !Number.isFinite(x) || !Number.isFinite(y)) {
      return { ok: false, message: `Line ${index + 1}: write two numbers, x then y.` }
    }
    vertices.push([x as number, y as number])
  }
  return { ok: true, vertices }
}

/** The same the other way, one vertex a line. */
export function typedVertices(vertices: readonly Vertex[]): string {
  return vertices.map(([x, y]) => `${x}, ${y}`).join('\n')
}
