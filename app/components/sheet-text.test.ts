import { describe, expect, it } from 'vitest'
import { readBlock, writeBlock } from './sheet-text'
import { safeCell } from './spreadsheet'

describe('a block on the clipboard', () => {
  it('has tabs between cells and newlines between rows', () => {
    expect(readBlock('W1\t190\r\nW2\t200\r\n')).toEqual([
      ['W1', '190'],
      ['W2', '200'],
    ])
  })

  it('keeps an empty cell at the end of a line and an empty line between two', () => {
    expect(readBlock('a\t\n\nb')).toEqual([['a', ''], [''], ['b']])
  })

  it('has quotes about a cell with a newline, a tab or a quote', () => {
    expect(readBlock('"two\nlines"\t"say ""dry"""')).toEqual([['two\nlines', 'say "dry"']])
  })

  it('leaves an inch mark at the start of a cell alone', () => {
    expect(readBlock('"\t4')).toEqual([['"', '4']])
  })

  it('comes back as it was written', () => {
    const rows = [
      ['W1', 'two\nlines', 'a\tb'],
      ['say "dry"', '', '−3'],
    ]
    expect(readBlock(writeBlock(rows))).toEqual(rows)
  })

  it('comes back without the mark that keeps a spreadsheet from running it', () => {
    expect(safeCell('=1+1')).toBe("'=1+1")
    expect(readBlock(writeBlock([[safeCell('=1+1'), safeCell('@site')]]))).toEqual([['=1+1', '@site']])
  })
})
