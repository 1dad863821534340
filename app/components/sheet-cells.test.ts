import { describe, expect, it } from 'vitest'
import { cellText, compareCells, readCell, type SheetColumn, shownCell } from './sheet-cells'

const metric = { length: 'm', time: 'd' } as const
const rate: SheetColumn = { field: 'rate', label: 'Rate', editor: 'quantity', dimension: 'rate' }
const level: SheetColumn = { field: 'base', label: 'Base level', editor: 'quantity', dimension: 'length' }
const levels: SheetColumn = { field: 'levels', label: 'Head', editor: 'levels', dimension: 'length' }
const line: SheetColumn = { field: 'line', label: 'Line', editor: 'vertices' }
const x: SheetColumn = { field: 'x', label: 'x', editor: 'number', unitText: 'm' }
const kind: SheetColumn = {
  field: 'kind',
  label: 'Kind',
  editor: 'choice',
  choices: [
    { value: 'abstraction', label: 'abstraction' },
    { value: 'recharge', label: 'recharge' },
  ],
}

describe('a cell with a quantity', () => {
  it('understands "12 ft" and keeps the entered number and unit', () => {
    expect(readCell(level, '12 ft', metric)).toEqual({ ok: true, value: { value: 12, unit: 'ft' } })
  })

  it('shows the value in the unit of its column beside what was entered', () => {
    expect(shownCell(level, { value: 12, unit: 'ft' }, metric)).toEqual({ text: '3.658', entered: '12 ft' })
    expect(shownCell(level, { value: -8.25, unit: 'm' }, metric)).toEqual({ text: '−8.25' })
  })

  it('is edited as it was typed', () => {
    expect(cellText(rate, { value: 3.5, unit: 'l/s' }, metric)).toBe('3.5 l/s')
    expect(cellText(rate, { value: 190, unit: 'm3/d' }, metric)).toBe('190')
  })

  it('keeps the text and says what is wrong with it', () => {
    expect(readCell(rate, '12 furlongs', metric)).toMatchObject({ ok: false, text: '12 furlongs' })
    expect(readCell(rate, '1,200', metric)).toMatchObject({
      ok: false,
      message: expect.stringContaining('1200'),
    })
  })

  it('is blank when nothing is typed: the rule of the row says whether it may be', () => {
    expect(readCell(rate, '  ', metric)).toEqual({ ok: true, value: null })
  })
})

describe('other cells', () => {
  it('print a coordinate with every digit that was entered', () => {
    expect(shownCell(x, 482600.123, metric).text).toBe('482\u202f600.123')
  })

  it('read vertices from text and from two columns of a spreadsheet', () => {
    const corner = [
      [120.5, 80],
      [140, 95],
    ]
    expect(readCell(line, '120.5 80; 140 95', metric)).toEqual({ ok: true, value: corner })
    expect(readCell(line, '120.5\t80\n140\t95', metric)).toEqual({ ok: true, value: corner })
    expect(readCell(line, '120.5, 80; 140, 95', metric)).toEqual({ ok: true, value: corner })
    expect(readCell(line, '120.5 80; 140', metric)).toMatchObject({ ok: false, text: '120.5 80; 140' })
  })

  it('read one level a vertex, each with its own unit if it has one', () => {
    expect(readCell(levels, '7.2; 23 ft', metric)).toEqual({
      ok: true,
      value: [
        { value: 7.2, unit: 'm' },
        { value: 23, unit: 'ft' },
      ],
    })
  })

  it('take a choice by its words in any case and refuse others with the list', () => {
    expect(readCell(kind, 'Recharge', metric)).toEqual({ ok: true, value: 'recharge' })
    expect(readCell(kind, 'injection', metric)).toMatchObject({
      ok: false,
      message: expect.stringContaining('abstraction, recharge'),
    })
  })

  it('sort quantities by size whatever their unit, with blanks last', () => {
    const values = [null, { value: 2, unit: 'm' }, { value: 3, unit: 'ft' }, { value: 50, unit: 'cm' }]
    const sorted = [...values].sort((a, b) => compareCells(level, a, b, metric))
    expect(sorted.map((one) => one?.unit ?? null)).toEqual(['cm', 'ft', 'm', null])
  })
})
