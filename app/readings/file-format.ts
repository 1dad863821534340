export const encodings = ['utf-8', 'utf-16le', 'utf-16be', 'windows-1252'] as const
export type Encoding = (typeof encodings)[number]

export const encodingWords: Record<Encoding, string> = {
  'utf-8': 'UTF-8',
  'utf-16le': 'UTF-16, little-endian',
  'utf-16be': 'UTF-16, big-endian',
  'windows-1252': 'Windows-1252',
}

export const delimiters = [',', ';', '\t', '|'] as const
export type Delimiter = (typeof delimiters)[number]

export const delimiterWords: Record<Delimiter, string> = {
  ',': 'comma',
  ';': 'semicolon',
  '\t': 'tab',
  '|': 'upright bar',
}

/** How bytes become rows of cells. */
export interface FileFormat {
  encoding: Encoding
  delimiter: Delimiter
}

/** The encoding that the first bytes of a file show: a byte order mark, the zeros of UTF-16, or valid UTF-8. */
export function detectEncoding(bytes: Uint8Array): { encoding: Encoding; mark: boolean } {
  const [a, b, c] = bytes
  if (a === 0xef && b === 0xbb && c === 0xbf) return { encoding: 'utf-8', mark: true }
  if (a === 0xff && b === 0xfe) return { encoding: 'utf-16le', mark: true }
  if (a === 0xfe && b === 0xff) return { encoding: 'utf-16be', mark: true }
  let evenZeros = 0
  let oddZeros = 0
  const looked = Math.min(bytes.length, 4096)
  for (let i = 0; i < looked; i++) {
    if (bytes[i] !== 0) continue
    if (i % 2 === 0) evenZeros++
    else oddZeros++
  }
  if (oddZeros > looked / 4 && evenZeros === 0) return { encoding: 'utf-16le', mark: false }
  if (evenZeros > looked / 4 && oddZeros === 0) return { encoding: 'utf-16be', mark: false }
  try {
    // Not the last call of a stream: a character cut by the end of the sample is no error.
    new TextDecoder('utf-8', { fatal: true }).decode(bytes, { stream: true })
    return { encoding: 'utf-8', mark: false }
  } catch (error) {
    if (error instanceof TypeError) return { encoding: 'windows-1252', mark: false }
    throw error
  }
}

/** What a file is when it is no text, by its first bytes; null when it may be text. */
export function notText(bytes: Uint8Array): string | null {
  const start = String.fromCharCode(...bytes.subarray(0, 8))
  if (start.startsWith('PK\u0003\u0004') || start.startsWith('\u00d0\u00cf\u0011\u00e0')) {
    return 'This is a workbook or an archive, not a text file: save the sheet as CSV and upload that.'
  }
  if (start.startsWith('%PDF')) return 'This is a PDF, not a text file: upload the readings as CSV.'
  const { encoding } = detectEncoding(bytes)
  if (!encoding.startsWith('utf-16') && bytes.includes(0)) {
    return 'This is not a text file: upload the readings as CSV.'
  }
  return null
}

/** How many cells a line has under one delimiter, quoted delimiters left out. */
function cellsIn(line: string, delimiter: Delimiter): number {
  let cells = 1
  let quoted = false
  for (const character of line) {
    if (character === '"') quoted = !quoted
    else if (character === delimiter && !quoted) cells++
  }
  return cells
}

/**
 * The delimiter under which most lines have the same number of cells, at least two. On a tie the rarer mark wins:
 * a decimal comma splits every line too.
 */
export function detectDelimiter(text: string): Delimiter {
  const lines = text.split(/\r\n|\n|\r/).filter((line) => line.trim() !== '')
  let best: Delimiter = ','
  let bestShare = 0
  for (const delimiter of ['\t', ';', '|', ','] as const) {
    const counts = new Map<number, number>()
    for (const line of lines) {
      const cells = cellsIn(line, delimiter)
      if (cells > 1) counts.set(cells, (counts.get(cells) ?? 0) + 1)
    }
    const share = Math.max(0, ...counts.values()) / Math.max(1, lines.length)
    if (share > bestShare + 1e-9) {
      best = delimiter
      bestShare = share
    }
  }
  return best
}

const numeric = /^[<>]?\s*[+−-]?\d[\d\s.,'/:TZ-]*$/

/** The row, counted from 1, that names the columns: the one above the first row with numbers in it. 0 for none. */
export function detectHeaderRow(rows: readonly (readonly string[])[]): number {
  const widths = new Map<number, number>()
  for (const row of rows) if (row.length > 1) widths.set(row.length, (widths.get(row.length) ?? 0) + 1)
  const usual = [...widths].sort((a, b) => b[1] - a[1])[0]?.[0] ?? 1
  const firstData = rows.findIndex(
    (row) => row.length === usual && row.some((cell) => numeric.test(cell.trim())),
  )
  if (firstData <= 0) return 0
  for (let index = firstData - 1; index >= 0; index--) {
    const row = rows[index] ?? []
    if (row.filter((cell) => cell.trim() !== '').length >= Math.min(2, usual)) return index + 1
    if (row.some((cell) => cell.trim() !== '')) return 0
  }
  return 0
}

export interface ColumnGuess {
  date: number | null
  time: number | null
  instrument: number | null
  value: number | null
  status: number | null
  x: number | null
  y: number | null
}

const columnWords: [keyof ColumnGuess, RegExp][] = [
  ['date', /^(date|datum|day|date\s*[/&+ ]?\s*time|datetime|timestamp|zeit(punkt|stempel)?)\b/i],
  ['time', /^(time|uhrzeit|hour)\b/i],
  [
    'instrument',
    /^(instrument|piezometer|piezo|standpipe|point|location|hole|borehole|bore|name|id|messstelle)\b/i,
  ],
  ['status', /^(status|remark|comment|note|bemerkung)/i],
  ['x', /^(x|easting|east|e)\b/i],
  ['y', /^(y|northing|north|n)\b/i],
  ['value', /^(dip|depth|level|head|water|pressure|value|reading|wasserstand|abstich)/i],
]

/** Which columns a header row names. Quantity and unit are never guessed. */
export function guessColumns(header: readonly string[]): ColumnGuess {
  const guess: ColumnGuess = {
    date: null,
    time: null,
    instrument: null,
    value: null,
    status: null,
    x: null,
    y: null,
  }
  for (const [index, cell] of header.entries()) {
    const name = cell.trim().replace(/_/g, ' ')
    for (const [key, words] of columnWords) {
      if (guess[key] === null && words.test(name)) {
        guess[key] = index
        break
      }
    }
  }
  if (guess.date === null && guess.time !== null) {
    guess.date = guess.time
    guess.time = null
  }
  return guess
}
