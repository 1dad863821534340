import iconv from 'iconv-lite'
import { describe, expect, test } from 'vitest'
import { detectDelimiter, detectEncoding, detectHeaderRow, guessColumns, notText } from './file-format'

const text = 'Point;Date;Dip in m\nBÖ 1;14.03.2026;4,25\n'

test.each([
  ['utf-8', Buffer.from(text), false],
  ['utf-8', Buffer.from(`\ufeff${text}`), true],
  ['utf-16le', iconv.encode(text, 'utf-16le', { addBOM: true }), true],
  ['utf-16le', iconv.encode(text, 'utf-16le'), false],
  ['utf-16be', iconv.encode(text, 'utf-16be', { addBOM: true }), true],
  ['windows-1252', iconv.encode(text, 'windows-1252'), false],
] as const)('%s is recognised by its bytes', (encoding, bytes, mark) => {
  expect(detectEncoding(bytes)).toEqual({ encoding, mark })
})

test('A character cut by the end of the sample does not make UTF-8 into something else', () => {
  const bytes = Buffer.from('Messstelle ä')
  expect(detectEncoding(bytes.subarray(0, bytes.length - 1)).encoding).toBe('utf-8')
})

describe('The delimiter', () => {
  test('A semicolon wins over decimal commas that split every line as well', () => {
    expect(detectDelimiter('01.02.2026;12,34\n02.02.2026;12,31\n')).toBe(';')
  })
  test('Tab, comma and bar are found; quoted commas do not count', () => {
    expect(detectDelimiter('a\tb\n1,5\t2\n')).toBe('\t')
    expect(detectDelimiter('a,b\n"x, y",2\n"z, w",3\n')).toBe(',')
    expect(detectDelimiter('a|b\n1|2\n')).toBe('|')
  })
})

test('The header is the row above the first numbers, below whatever the logger wrote first', () => {
  const rows = [
    ['Logger', 'L7'],
    ['Serial', 'SN-1'],
    [''],
    ['Date', 'Time', 'Level'],
    ['2026-03-14', '09:00', '12.5'],
    ['2026-03-14', '10:00', '12.4'],
  ]
  expect(detectHeaderRow(rows)).toBe(4)
  expect(detectHeaderRow([['2026-03-14', '12.5']])).toBe(0)
})

test('Columns are recognised by their names, quantity and unit are not', () => {
  expect(guessColumns(['Piezometer', 'Date', 'Time', 'Dip (m)', 'Remark'])).toEqual({
    instrument: 0,
    date: 1,
    time: 2,
    value: 3,
    status: 4,
    x: null,
    y: null,
  })
  expect(guessColumns(['x_km', 'y_km', 'head_m'])).toMatchObject({ x: 0, y: 1, value: 2, date: null })
})

test('Workbooks, PDFs and other binaries are named as what they are', () => {
  expect(notText(Buffer.from('PK\u0003\u0004rest'))).toContain('save the sheet as CSV')
  expect(notText(Buffer.from('%PDF-1.7'))).toContain('PDF')
  expect(notText(Buffer.from([1, 2, 0, 3]))).toContain('not a text file')
  expect(notText(iconv.encode(text, 'utf-16le'))).toBeNull()
  expect(notText(Buffer.from(text))).toBeNull()
})
