/** A cell of a downloaded or copied table. */
export type Cell = string | number | null

/**
 * Text that a spreadsheet would run as a formula gets an apostrophe in front; numbers stay numbers.
 * Source of the list of first characters: OWASP, "CSV Injection".
 */
export function safeCell(cell: Cell): string {
  if (cell === null) return ''
  if (typeof cell === 'number') return Number.isFinite(cell) ? String(cell) : ''
  return /^[=+\-@\t\r]/.test(cell) ? `'${cell}` : cell
}

/** RFC 4180 text with CRLF line ends and a byte order mark, so that spreadsheets read it as UTF-8. */
export function toCsv(rows: readonly (readonly Cell[])[]): string {
  const quoted = (text: string) => (/[",\r\n]/.test(text) ? `"${text.replace(/"/g, '""')}"` : text)
  return `\ufeff${rows.map((row) => row.map((cell) => quoted(safeCell(cell))).join(',')).join('\r\n')}\r\n`
}

/** Tab-separated text for the clipboard. */
export function toTsv(rows: readonly (readonly Cell[])[]): string {
  return rows.map((row) => row.map((cell) => safeCell(cell).replace(/[\t\r\n]+/g, ' ')).join('\t')).join('\n')
}
