import type { Readable } from 'node:stream'
import { CsvError, parse } from 'csv-parse'
import { parse as parseNow } from 'csv-parse/sync'
import iconv from 'iconv-lite'
import {
  type Delimiter,
  detectDelimiter,
  detectEncoding,
  detectHeaderRow,
  type Encoding,
} from './file-format'

/** A file that can't be read as rows of cells; the message says where it breaks. */
export class UnreadableFile extends Error {}

const longestRow = 64 * 1024
/** A year of one reading a second is 32 million rows; a file that long is read in parts. */
const mostRows = 10_000_000

function options(delimiter: Delimiter) {
  return {
    delimiter,
    relax_quotes: true,
    relax_column_count: true,
    // Loggers write a header block and data with different line ends into one file.
    record_delimiter: ['\r\n', '\n', '\r'],
    max_record_size: longestRow,
  }
}

export interface FileRow {
  /** From 1, blank rows counted: the line of the file, unless a quoted cell holds line breaks. */
  row: number
  cells: string[]
  blank: boolean
}

/**
 * The rows of a file one by one, with memory for one of them. `onBytes` hears of every chunk.
 * Throws UnreadableFile on a quote that is never closed and on a row beyond 64 KB, with the row's number; and on a file
 * of more than ten million rows.
 */
export async function* fileRows(
  body: Readable,
  format: { encoding: Encoding; delimiter: Delimiter },
  onBytes?: (bytes: number) => void,
): AsyncGenerator<FileRow> {
  const decoder = iconv.decodeStream(format.encoding, { stripBOM: true })
  const parser = parse(options(format.delimiter))
  if (onBytes) body.on('data', (chunk: Buffer) => onBytes(chunk.length))
  // A broken download must end the loop below, not hang it.
  body.on('error', (error) => parser.destroy(error))
  decoder.on('error', (error: Error) => parser.destroy(error))
  body.pipe(decoder).pipe(parser)
  let row = 0
  try {
    for await (const cells of parser as AsyncIterable<string[]>) {
      row++
      if (row > mostRows) {
        throw new UnreadableFile(`The file has more than ${mostRows} rows: split it.`)
      }
      yield { row, cells, blank: cells.every((cell) => cell.trim() === '') }
    }
  } catch (error) {
    if (!(error instanceof CsvError)) throw error
    // Rows read before the error may not have been taken out of the parser yet: it knows their number.
    const at = Number(error.records ?? row) + 1
    throw new UnreadableFile(
      error.code === 'CSV_QUOTE_NOT_CLOSED' || error.code === 'CSV_MAX_RECORD_SIZE'
        ? `Row ${at} can't be read: a quotation mark in it is never closed, or the row is longer than 64 KB.`
        : `Row ${at} can't be read: ${error.message}`,
    )
  } finally {
    body.destroy()
    parser.destroy()
  }
}

/** The first bytes of a stream, which is closed then. */
export async function firstBytes(body: Readable, most = longestRow): Promise<Buffer> {
  const chunks: Buffer[] = []
  let bytes = 0
  for await (const chunk of body) {
    chunks.push(chunk as Buffer)
    bytes += (chunk as Buffer).length
    if (bytes >= most) break
  }
  body.destroy()
  return Buffer.concat(chunks).subarray(0, most)
}

export interface FileSample {
  encoding: Encoding
  delimiter: Delimiter
  /** As detected; 0 for none. */
  headerRow: number
  byteOrderMark: boolean
  /** The first rows, cells cut to 60 characters. */
  rows: string[][]
}

/** The first rows of a file, read in the format given or else the one detected. */
export function sampleRows(
  bytes: Buffer,
  chosen: { encoding?: Encoding; delimiter?: Delimiter } = {},
  most = 40,
): FileSample {
  const detected = detectEncoding(bytes)
  const encoding = chosen.encoding ?? detected.encoding
  const whole = iconv.decode(bytes, encoding, { stripBOM: true })
  // The sample may end within a row: leave that one out, unless it is all there is.
  const end = Math.max(whole.lastIndexOf('\n'), whole.lastIndexOf('\r'))
  const text = end > 0 && bytes.length >= longestRow ? whole.slice(0, end) : whole
  const lines = text
    .replace(/[\r\n]+$/, '')
    .split(/\r\n|\n|\r/)
    .slice(0, 400)
  const delimiter = chosen.delimiter ?? detectDelimiter(lines.join('\n'))
  const rows = lines.map((line) => cellsOf(line, delimiter))
  return {
    encoding,
    delimiter,
    headerRow: detectHeaderRow(rows),
    byteOrderMark: detected.mark,
    rows: rows.slice(0, most).map((cells) => cells.slice(0, 60).map((cell) => cell.slice(0, 60))),
  }
}

/** The cells of one line; a line with a quote left open is shown as it stands. */
function cellsOf(line: string, delimiter: Delimiter): string[] {
  if (line === '') return ['']
  try {
    const [cells] = parseNow(line, options(delimiter)) as string[][]
    return cells ?? ['']
  } catch (error) {
    if (error instanceof CsvError) return line.split(delimiter)
    throw error
  }
}
