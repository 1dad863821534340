import { describe, expect, it } from 'vitest'
import { planPaste } from './sheet'
import type { SheetColumn } from './sheet-cells'
import { readBlock } from './sheet-text'

const units = { length: 'm', time: 'd' } as const
const columns: SheetColumn[] = [
  { field: 'name', label: 'Well', editor: 'text' },
  { field: 'x', label: 'x', editor: 'number', unitText: 'm' },
  {
    field: 'kind',
    label: 'Kind',
    editor: 'choice',
    choices: [
      { value: 'abstraction', label: 'abstraction' },
      { value: 'recharge', label: 'recharge' },
    ],
  },
  { field: 'rate', label: 'Rate', editor: 'quantity', dimension: 'rate' },
  { field: 'share', label: 'Share', editor: 'text', reads: () => '50 %' },
  {
    field: 'lowestLevel',
    label: 'Lowest level',
    editor: 'quantity',
    dimension: 'length',
    applies: (body) => body.kind === 'abstraction',
  },
]
const rows = [
  { id: 'a', body: { name: 'W1', kind: 'abstraction' } },
  { id: 'b', body: { name: 'W2', kind: 'recharge' } },
]

function paste(text: string, at: { rowId: string; field: string } | null = null) {
  let count = 0
  return planPaste({
    block: readBlock(text),
    columns,
    rows,
    at,
    units,
    newId: () => `new ${++count}`,
    newRow: () => ({ kind: 'abstraction' }),
  })
}

describe('a block pasted into a sheet', () => {
  it('fills cells to the right and down from the one with the focus', () => {
    expect(paste('100\trecharge\n120\tabstraction', { rowId: 'a', field: 'x' })).toEqual([
      {
        op: 'set',
        id: 'a',
        cells: { x: { ok: true, value: 100 }, kind: { ok: true, value: 'recharge' } },
      },
      {
        op: 'set',
        id: 'b',
        cells: { x: { ok: true, value: 120 }, kind: { ok: true, value: 'abstraction' } },
      },
    ])
  })

  it('makes new rows of the lines beyond the last one', () => {
    const edits = paste('W2\nW3\nW4', { rowId: 'b', field: 'name' })
    expect(edits.map((edit) => [edit.op, edit.id])).toEqual([
      ['set', 'b'],
      ['add', 'new 1'],
      ['add', 'new 2'],
    ])
  })

  it('adds rows below when no cell has the focus, and passes over headings that repeat the columns', () => {
    const edits = paste('Well\tx (m)\tKind\nW9\t7\trecharge\n')
    expect(edits).toEqual([
      {
        op: 'add',
        id: 'new 1',
        body: { kind: 'abstraction' },
        cells: {
          name: { ok: true, value: 'W9' },
          x: { ok: true, value: 7 },
          kind: { ok: true, value: 'recharge' },
        },
      },
    ])
  })

  it('keeps the text of a cell that it cannot read', () => {
    const [edit] = paste('lots', { rowId: 'a', field: 'rate' })
    expect(edit).toMatchObject({ cells: { rate: { ok: false, text: 'lots' } } })
  })

  it('never touches a computed cell, nor one that means nothing for its row', () => {
    const [edit] = paste('5\t99 %\t-12', { rowId: 'b', field: 'rate' })
    expect(edit).toEqual({
      op: 'set',
      id: 'b',
      cells: { rate: { ok: true, value: { value: 5, unit: 'm3/d' } } },
    })
  })

  it('fits into where it was copied from, computed columns included', () => {
    const [edit] = paste('W1\t3\tabstraction\t5\t50 %\t-12', { rowId: 'a', field: 'name' })
    expect(edit).toMatchObject({ cells: { lowestLevel: { ok: true, value: { value: -12, unit: 'm' } } } })
  })
})
