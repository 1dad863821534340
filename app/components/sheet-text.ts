/** Text as spreadsheets put it on the clipboard: tabs between cells, newlines between rows, quotes where needed. */

/** Reads a block that was copied in a spreadsheet. A cell with a tab, a newline or a quote comes quoted. */
export function readBlock(text: string): string[][] {
  const rows: string[][] = []
  let row: string[] = []
  let cell = ''
  let quoted = false
  for (let i = 0; i < text.length; i++) {
    const character = text[i] as string
    if (quoted) {
      if (character !== '"') cell += character
      else if (text[i + 1] === '"') {
        cell += '"'
        i++
      } else quoted = false
    } else if (character === '"' && cell === '' && closesItself(text, i)) quoted = true
    else if (character === '\t') {
      row.push(unescapeFormula(cell))
      cell = ''
    } else if (character === '\n' || character === '\r') {
      if (character === '\r' && text[i + 1] === '\n') i++
      row.push(unescapeFormula(cell))
      rows.push(row)
      row = []
      cell = ''
    } else cell += character
  }
  if (cell !== '' || row.length > 0) rows.push([...row, unescapeFormula(cell)])
  return rows
}

/** A lone inch mark at the start of a cell is text, not the start of a quotation. */
function closesItself(text: string, start: number): boolean {
  for (let i = start + 1; i < text.length; i++) {
    if (text[i] !== '"') continue
    if (text[i + 1] === '"') i++
    else return i + 1 === text.length || '\t\r\n'.includes(text[i + 1] as string)
  }
  return false
}

/** Writes a block for a spreadsheet. */
export function writeBlock(rows: readonly (readonly string[])[]): string {
  return rows.map((row) => row.map(quoteCell).join('\t')).join('\n')
}

function quoteCell(cell: string): string {
  return /[\t\r\n"]/.test(cell) ? `"${cell.replaceAll('"', '""')}"` : cell
}

/** Takes back what safeCell put in front of a text when it was copied. */
function unescapeFormula(text: string): string {
  return /^'[=+\-@\t\r]/.test(text) ? text.slice(1) : text
}
