import type { Content, ContentTable, ContentText, TableCell } from 'pdfmake/interfaces'
import type { DrawnFigure } from './figures'

/** The pieces that a package is set from: text, tables and figures, and what of them stays together on a page. */

export const ink = '#14191d'
export const grey = '#4a5258'
export const alarm = '#96301f'
const amber = '#9a6a14'
const rule = '#c9c9c2'
const paper = '#f4f3ee'

/** A4 with a binding edge on the left, in points. */
export const page = { width: 595.28, height: 841.89, left: 62, top: 60, right: 48, bottom: 54 }
export const textWidth = page.width - page.left - page.right
const textHeight = page.height - page.top - page.bottom

export const bodySize = 9.5
const tableSize = 8.8
const smallSize = 8.5
const cellPadding = 2.1

/** Taller than this, a subsection may break over pages; less tall, it moves to the next page as a whole. */
const keptTogether = 0.5 * textHeight
/** What must fit below the heading or caption of something that may break, in points. */
const roomBelowHeading = 100

/** What a sourced row says when nobody has stated where it came from; printed so that it cannot be missed. */
export const notStated = 'not stated'

export const styles = {
  section: { fontSize: 17, bold: true, margin: [0, 0, 0, 6] as [number, number, number, number] },
  sub: { fontSize: 11.5, bold: true, margin: [0, 11, 0, 4] as [number, number, number, number] },
  caption: { fontSize: smallSize, color: grey },
  small: { fontSize: smallSize, color: grey },
}

/**
 * A piece of the document with its height as estimated, in points; `splits` when it may break over pages. What does not
 * split must be far from a page tall: pdfmake drops what an unbreakable block holds beyond one page.
 */
export interface Piece {
  content: Content
  height: number
  splits?: boolean
}

// ---- how much room text takes ---------------------------------------------------------------------------------

/** Ascender, descender and the leading of this document, as parts of the size. */
const leading = 1.33 * 1.14

/** Width of text in Source Sans 3 by classes of letters; a few per cent wide, so that what is fitted to it fits. */
export function estimatedWidth(text: string, size: number, bold = false): number {
  let ems = 0
  for (const letter of text) {
    if (/[0-9−]/.test(letter)) ems += 0.5
    else if (/[ .,:;'’|!ijlI()[\]\u202f\u00a0]/.test(letter)) ems += 0.27
    else if (/[mwMW%@…–→]/.test(letter)) ems += 0.83
    else if (/\p{Lu}/u.test(letter)) ems += 0.6
    else ems += 0.51
  }
  return ems * size * (bold ? 1.05 : 1)
}

function estimatedLines(text: string, width: number, size: number, bold = false): number {
  return text
    .split('\n')
    .reduce((lines, line) => lines + Math.max(1, Math.ceil(estimatedWidth(line, size, bold) / width)), 0)
}

// ---- text -----------------------------------------------------------------------------------------------------

type Run = string | { text: string; bold?: boolean; italics?: boolean; sub?: boolean; color?: string }

export function text(runs: Run | Run[], more: Partial<ContentText> = {}): Piece {
  const all = Array.isArray(runs) ? runs : [runs]
  const words = all.map((run) => (typeof run === 'string' ? run : run.text)).join('')
  return {
    content: { text: all, margin: [0, 0, 0, 5], ...more },
    height: estimatedLines(words, textWidth, bodySize) * bodySize * leading + 5,
    splits: words.length > 1200,
  }
}

/** "Label. Text", or nothing without a text. */
export function labelled(label: string, words: string | undefined): Piece[] {
  return words ? [text([{ text: `${label}. `, bold: true }, words])] : []
}

export function bullets(lines: readonly string[]): Piece {
  const height = lines.reduce(
    (sum, line) => sum + estimatedLines(line, textWidth - 14, bodySize) * bodySize * leading + 1.5,
    8,
  )
  return {
    content: { ul: lines.map((line) => ({ text: line, margin: [0, 0, 0, 1.5] })), margin: [0, 0, 0, 8] },
    height,
    splits: height > keptTogether,
  }
}

/** A warning to the reader, set off by a bar. */
export function caution(words: string): Piece {
  return {
    content: {
      table: {
        widths: ['*'],
        dontBreakRows: true,
        body: [[{ text: words, fontSize: tableSize, color: grey }]],
      },
      layout: {
        hLineWidth: () => 0,
        vLineWidth: (i: number) => (i === 0 ? 2 : 0),
        vLineColor: () => amber,
        paddingLeft: () => 8,
        paddingTop: () => 1,
        paddingBottom: () => 1,
      },
      margin: [0, 6, 0, 8],
    },
    height: estimatedLines(words, textWidth - 10, tableSize) * tableSize * leading + 16,
  }
}

// ---- sections and subsections ---------------------------------------------------------------------------------

/** A section begins a page, and stands in the contents and in the bookmarks. */
export function section(number: number, title: string, ...parts: Content[]): Content[] {
  const heading = {
    text: `${number}   ${title}`,
    style: 'section',
    pageBreak: 'before',
    tocItem: true,
    tocStyle: { bold: true },
    tocMargin: [0, 3, 0, 0],
    outline: true,
    id: `section-${number}`,
  } as Content
  return [heading, ...parts]
}

/**
 * A subsection under its heading. A short one is not broken over pages; of a long one, the heading stays with what
 * comes first and each short piece stays whole.
 */
export function subsection(no: string, title: string, ...pieces: Piece[]): Content {
  const heading = {
    text: `${no}   ${title}`,
    style: 'sub',
    tocItem: true,
    tocMargin: [18, -1.6, 0, 0],
    outline: true,
    outlineParentId: `section-${no.split('.')[0]}`,
  }
  const headingHeight = 30
  const bound: Content[] = []
  const rest: Content[] = []
  let height = headingHeight
  for (const [index, piece] of pieces.entries()) {
    // Words that lead up to a table or a figure go with it.
    const most = (height < 150 ? 0.9 : 0.5) * textHeight
    if (bound.length === index && !piece.splits && height + piece.height <= most) {
      bound.push(piece.content)
      height += piece.height
    } else rest.push(piece.splits ? piece.content : { stack: [piece.content], unbreakable: true })
  }
  const breaksSoon = pieces[bound.length]?.splits === true && height < 150
  if (breaksSoon) {
    return { stack: [{ ...heading, headlineLevel: height + roomBelowHeading } as Content, ...bound, ...rest] }
  }
  return { stack: [{ stack: [heading as Content, ...bound], unbreakable: true }, ...rest] }
}

/** Subsections on one page, where the caller knows that together they are far from a page tall. */
export function keptWhole(together: boolean, ...subsections: Content[]): Content {
  return { stack: subsections, unbreakable: together }
}

/**
 * True where pdfmake shall begin a page first. Headings and captions of what may break over pages carry the room they
 * need, in points, as their headline level.
 */
export function wantsNewPage(node: { headlineLevel?: number; startPosition: { top: number } }): boolean {
  return (
    node.headlineLevel !== undefined &&
    node.startPosition.top > page.height - page.bottom - node.headlineLevel
  )
}

// ---- tables ---------------------------------------------------------------------------------------------------

export interface TableColumn<Row> {
  head: string
  unit?: string
  /** Words stand on the left and may wrap; numbers stand on the right and do not. The first column is always words. */
  words?: boolean
  /** Left out when no row says anything here. */
  optional?: boolean
  cell: (row: Row) => string
}

const layout = (rows: number, afterNumbers: readonly boolean[]) => ({
  hLineWidth: (i: number) => (i === 0 || i === 1 || i === rows ? 0.7 : 0.35),
  hLineColor: (i: number) => (i === 0 || i === 1 || i === rows ? grey : rule),
  vLineWidth: () => 0,
  paddingLeft: (i: number) => leftPadding(i, afterNumbers),
  paddingRight: () => 3,
  paddingTop: () => cellPadding,
  paddingBottom: () => cellPadding,
  fillColor: (row: number) => (row === 0 ? paper : null),
})

function leftPadding(column: number, afterNumbers: readonly boolean[]): number {
  return column === 0 ? 2 : afterNumbers[column] ? 12 : 5
}

/**
 * Widths of columns that fill the measure. Numbers get what they need; words share the rest when it is short. What is
 * left over goes to every column a little, then to the last column of words.
 */
export function columnWidths(
  columns: readonly { natural: number; words: boolean }[],
  available: number,
): number[] {
  const total = columns.reduce((sum, column) => sum + column.natural, 0)
  if (total <= available) {
    const more = Math.min(26, (available - total) / columns.length)
    const widths = columns.map(({ natural }) => natural + more)
    const widest = columns.reduce((at, { words }, index) => (words ? index : at), 0)
    const left = available - total - more * columns.length
    return widths.map((width, index) => (index === widest ? width + left : width))
  }
  // Numbers too wide to keep whole are treated as words.
  const numbers = columns.reduce((sum, { natural, words }) => sum + (words ? 0 : natural), 0)
  const all = numbers > 0.75 * available
  const shares = (column: { words: boolean }) => all || column.words
  let left = available - (all ? 0 : numbers)
  let open = columns.filter(shares).sort((a, b) => a.natural - b.natural)
  const granted = new Map<object, number>()
  while (open.length > 0) {
    const [least] = open as [(typeof open)[number], ...typeof open]
    const share = Math.min(least.natural, left / open.length)
    granted.set(least, share)
    left -= share
    open = open.slice(1)
  }
  return columns.map((column) => granted.get(column) ?? column.natural)
}

/** A captioned table. It says so in words when it has no row. */
export function table<Row>(
  no: string,
  caption: string,
  allColumns: readonly TableColumn<Row>[],
  rows: readonly Row[],
): Piece {
  if (rows.length === 0) return text({ text: `${caption}: none.`, color: grey })
  const says = (column: TableColumn<Row>) =>
    rows.some((row) => column.cell(row) !== '' && column.cell(row) !== '–')
  const columns = allColumns.filter((column) => !column.optional || says(column))
  const isWords = columns.map((column, index) => index === 0 || column.words === true)
  const cells = rows.map((row) => columns.map((column) => column.cell(row)))
  const heads = columns.map(({ head, unit }) => (unit ? `${head} ${unit}` : head))
  const natural = columns.map((_, index) => ({
    words: isWords[index] === true,
    // Two points more, so that a short head does not lose its full stop to the next line.
    natural:
      2 +
      cells.reduce(
        (widest, row) => Math.max(widest, estimatedWidth(row[index] ?? '', tableSize, index === 0)),
        estimatedWidth(heads[index] ?? '', smallSize, true),
      ),
  }))
  const afterNumbers = isWords.map((words, index) => words && index > 0 && isWords[index - 1] === false)
  const padding = columns.reduce((sum, _, index) => sum + leftPadding(index, afterNumbers) + 3, 0)
  const widths = columnWidths(natural, textWidth - padding)
  const rowHeight = (row: readonly string[], size: number, bold: boolean) =>
    2 * cellPadding +
    0.35 +
    Math.max(
      ...row.map((cell, index) => estimatedLines(cell, widths[index] ?? 1, size, bold || index === 0)),
    ) *
      size *
      leading
  const heights = cells.map((row) => rowHeight(row, tableSize, false))
  const height = 20 + rowHeight(heads, smallSize, true) + heights.reduce((sum, one) => sum + one, 0) + 8
  const align = (index: number) => (isWords[index] ? 'left' : 'right')
  const head: TableCell[] = columns.map((column, index) => ({
    text: [{ text: column.head, bold: true }, column.unit ? { text: ` ${column.unit}`, color: grey } : ''],
    fontSize: smallSize,
    alignment: align(index),
  }))
  const body: TableCell[][] = cells.map((row) =>
    row.map((cell, index) => ({
      text: cell,
      fontSize: tableSize,
      bold: index === 0,
      alignment: align(index),
      ...(cell === notStated ? { color: alarm, bold: true } : {}),
    })),
  )
  const splits = height > keptTogether
  return {
    content: {
      stack: [
        {
          text: [{ text: `Table ${no}  `, bold: true, color: ink }, caption],
          style: 'caption',
          margin: [0, 5, 0, 3],
          ...(splits ? { headlineLevel: roomBelowHeading } : {}),
        },
        {
          table: {
            headerRows: 1,
            // A row that is itself nearly a page tall has to break.
            dontBreakRows: Math.max(...heights) < 0.6 * textHeight,
            keepWithHeaderRows: 1,
            widths,
            body: [head, ...body],
          },
          layout: layout(body.length + 1, afterNumbers),
          margin: [0, 0, 0, 8],
        },
      ],
    },
    height,
    splits,
  }
}

/**
 * A table whose rows carry sources. Where rows share sources, each gets the number of its source, listed once below
 * the table; where nearly every row has its own, the source stands in the row.
 */
export function sourcedTable<Row extends { source: string }>(
  no: string,
  caption: string,
  columns: readonly TableColumn<Row>[],
  rows: readonly Row[],
): Piece {
  const sources = [...new Set(rows.map((row) => row.source).filter(Boolean))]
  if (sources.length > 3 && sources.length > rows.length / 2) {
    const own = { head: 'Source', words: true, cell: (row: Row) => row.source || notStated }
    return table(no, caption, [...columns, own], rows)
  }
  const mark = (row: Row) => (row.source ? `[${sources.indexOf(row.source) + 1}]` : notStated)
  const piece = table(no, caption, [...columns, { head: 'Source', words: true, cell: mark }], rows)
  if (sources.length === 0) return piece
  const lines = sources.map(
    (source, index): Content => ({
      columns: [
        { text: `[${index + 1}]`, width: 20 },
        { text: source, width: '*' },
      ],
      fontSize: smallSize,
      color: grey,
      margin: [2, index === 0 ? -3 : 0, 0, index === sources.length - 1 ? 8 : 1],
    }),
  )
  const height = sources.reduce(
    (sum, source) => sum + estimatedLines(source, textWidth - 24, smallSize) * smallSize * leading + 1,
    8,
  )
  return {
    content: { stack: [piece.content, ...lines] },
    height: piece.height + height,
    splits: piece.splits || piece.height + height > keptTogether,
  }
}

/** Label and value, one pair a line. */
export function facts(rows: readonly (readonly [label: string, value: string])[]): Piece {
  const width = 150
  const body: TableCell[][] = rows.map(([label, value]) => [
    { text: label, color: grey },
    { text: value || '–' },
  ])
  const height = rows.reduce(
    (sum, [, value]) =>
      sum +
      2 * cellPadding +
      0.35 +
      estimatedLines(value, textWidth - width - 13, bodySize) * bodySize * leading,
    10,
  )
  return {
    content: {
      table: { widths: [width, '*'], dontBreakRows: true, body },
      layout: {
        ...layout(body.length, []),
        fillColor: () => null,
        hLineWidth: () => 0.35,
        hLineColor: () => rule,
      },
      margin: [0, 2, 0, 8],
    },
    height,
    splits: height > keptTogether,
  }
}

/** Who has signed, as the cover shows it. */
export function signatures(rows: readonly { label: string; name: string | null; signed: string }[]): Content {
  const body: TableCell[][] = rows.map(({ label, name, signed }) => [
    { text: label, color: grey },
    { text: name ?? 'not signed', bold: name !== null, color: name === null ? alarm : ink },
    { text: signed, alignment: 'right' },
  ])
  const head = (words: string, alignment: 'left' | 'right' = 'left') => ({
    text: words,
    bold: true,
    fontSize: smallSize,
    alignment,
  })
  return {
    table: {
      widths: [150, '*', 130],
      body: [[head('Role'), head('Name'), head('Signed', 'right')], ...body],
    },
    layout: layout(body.length + 1, []),
    margin: [0, 0, 0, 8],
  } as ContentTable
}

// ---- figures --------------------------------------------------------------------------------------------------

/** A figure over its caption. `share`: how much of the measure it takes. */
export function figure(no: string, { svg, ratio, caption }: DrawnFigure, lead: string, share = 1): Piece {
  // Never taller than a page leaves it, however tall the site is.
  const width = Math.min(textWidth * share, (0.7 * textHeight) / ratio)
  return {
    content: {
      stack: [
        { svg, width, height: width * ratio },
        {
          text: [{ text: `Fig. ${no}  `, bold: true, color: ink }, lead, caption],
          style: 'caption',
          margin: [0, 3, 0, 6],
        },
      ],
    },
    height: width * ratio + estimatedLines(lead + caption, textWidth, smallSize) * smallSize * leading + 16,
  }
}
