import { describe, expect, it } from 'vitest'
import { z } from 'zod'
import type { Row, RowChange } from './row'
import { createRowsStore, type RowEdit, type Sent } from './rows-store'

const schemas = {
  well: z.strictObject({
    name: z.string().min(1, 'Name the well.'),
    rate: z.number({ error: 'A rate is needed.' }),
    note: z.string().default(''),
  }),
}

function row(id: string, version: number, body: unknown): Row<unknown> {
  return {
    id,
    version,
    kind: 'well',
    position: 1,
    body,
    recordedFrom: '2026-03-01T00:00:00.000Z',
    recordedBy: 'Ann',
  }
}

const w1 = { name: 'W1', rate: 190, note: '' }
const w2 = { name: 'W2', rate: 200, note: '' }

function pageWith(options: { answers?: Sent[]; shelf?: { text: string | null } } = {}) {
  const sent: RowChange[][] = []
  const answers = options.answers ?? []
  const shelf = options.shelf ?? { text: null }
  const store = createRowsStore({
    rows: [row('a', 1, w1), row('b', 4, w2)],
    schemas,
    saveAfterMilliseconds: 1_000_000,
    send: async (changes) => {
      sent.push(changes)
      return (
        answers.shift() ?? {
          kind: 'answer',
          answer: {
            ok: true,
            rows: changes
              .filter((change) => change.op !== 'delete')
              .map((change) => ({ id: change.id, version: change.op === 'add' ? 1 : change.version + 1 })),
          },
        }
      )
    },
    shelf: {
      read: () => shelf.text,
      write: (text) => {
        shelf.text = text
      },
    },
  })
  const bodies = () => store.snapshot().rows.map((one) => one.body)
  return { store, sent, shelf, bodies }
}

function set(id: string, field: string, value: unknown): RowEdit {
  return { op: 'set', id, cells: { [field]: { ok: true, value } } }
}

describe('rows while somebody edits them', () => {
  it('are saved with the version that was seen, and take the new one', async () => {
    const { store, sent } = pageWith()
    store.apply([set('a', 'rate', 210)])
    expect(store.snapshot().unsaved).toBe(true)
    await store.save()
    expect(sent).toEqual([[{ op: 'edit', kind: 'well', id: 'a', version: 1, body: { ...w1, rate: 210 } }]])
    expect(store.snapshot()).toMatchObject({ unsaved: false, saving: { state: 'saved' } })
    expect(store.snapshot().rows[0]?.version).toBe(2)
  })

  it('hold back a row whose cell cannot be read, keep its text, and save the others', async () => {
    const { store, sent } = pageWith()
    store.apply([
      {
        op: 'set',
        id: 'a',
        cells: { rate: { ok: false, text: 'lots', message: '"lots" is not a number.' } },
      },
      set('b', 'rate', 220),
    ])
    await store.save()
    expect(sent.flat().map((change) => change.id)).toEqual(['b'])
    expect(store.snapshot().rows[0]?.typed.rate?.text).toBe('lots')
    expect(store.snapshot().saving).toEqual({ state: 'attention', count: 1 })
  })

  it('hold back a new row until what its rules need is there', async () => {
    const { store, sent } = pageWith()
    store.apply([{ op: 'add', id: 'c', kind: 'well', body: { name: 'W3' }, cells: {} }])
    await store.save()
    expect(sent).toEqual([])
    expect(store.snapshot().rows[2]?.problems).toEqual([
      { id: 'c', field: 'rate', message: 'A rate is needed.' },
    ])
    store.apply([set('c', 'rate', 5)])
    await store.save()
    expect(sent.flat()).toMatchObject([{ op: 'add', id: 'c', body: { name: 'W3', rate: 5 } }])
  })

  it('are not sent again when a value was changed and changed back', async () => {
    const { store, sent } = pageWith()
    store.apply([set('a', 'rate', 210)])
    store.apply([set('a', 'rate', 190)])
    await store.save()
    expect(sent).toEqual([])
    expect(store.snapshot().unsaved).toBe(false)
  })
})

describe('undo', () => {
  it('takes back a whole paste at once and brings it again', () => {
    const { store, bodies } = pageWith()
    store.apply([
      set('a', 'rate', 1),
      set('b', 'rate', 2),
      { op: 'add', id: 'c', kind: 'well', body: {}, cells: {} },
    ])
    store.undo()
    expect(bodies()).toEqual([w1, w2])
    expect(store.snapshot().canUndo).toBe(false)
    store.redo()
    expect(store.snapshot().rows.map((one) => one.body.rate)).toEqual([1, 2, undefined])
  })

  it('brings a deleted row back to its place, as a new change once it was saved', async () => {
    const { store, sent, bodies } = pageWith()
    store.apply([{ op: 'delete', id: 'a' }])
    await store.save()
    store.undo()
    expect(bodies()).toEqual([w1, w2])
    await store.save()
    expect(sent.flat().map((change) => change.op)).toEqual(['delete', 'add'])
  })

  it("leaves alone what a colleague changed in the same row's other fields", async () => {
    const { store, bodies } = pageWith()
    store.apply([set('a', 'rate', 210)])
    await store.save()
    store.refresh([row('a', 3, { ...w1, rate: 210, note: 'from Tom' }), row('b', 4, w2)])
    store.undo()
    expect(bodies()[0]).toEqual({ ...w1, note: 'from Tom' })
  })

  it('takes a run of keystrokes in one field as one', () => {
    const { store, bodies } = pageWith()
    for (const text of ['a', 'as', 'as built']) {
      store.apply([{ op: 'set', id: 'a', cells: { note: { ok: true, value: text } }, typing: true }])
    }
    store.undo()
    expect(bodies()[0]).toEqual(w1)
  })
})

describe('two people on the same row', () => {
  const theirs = { version: 2, body: { ...w1, rate: 500 }, by: 'Tom', at: '2026-03-02T00:00:00.000Z' }
  const conflict: Sent = {
    kind: 'answer',
    answer: { ok: false, problems: [], conflicts: [{ id: 'a', kind: 'well', theirs, yours: null }] },
  }

  it('see both values; the other rows are saved meanwhile', async () => {
    const { store, sent } = pageWith({ answers: [conflict] })
    store.apply([set('a', 'rate', 210), set('b', 'rate', 220)])
    await store.save()
    expect(store.snapshot().conflicts).toEqual([
      { id: 'a', kind: 'well', base: w1, theirs, mine: { ...w1, rate: 210 } },
    ])
    await store.save()
    expect(sent[1]?.map((change) => change.id)).toEqual(['b'])
    expect(store.snapshot().saving).toEqual({ state: 'conflict', count: 1 })
  })

  it('see what was typed after the save was refused, too', async () => {
    const { store } = pageWith({ answers: [conflict] })
    store.apply([set('a', 'rate', 210)])
    await store.save()
    store.apply([set('a', 'note', 'as built')])
    expect(store.snapshot().conflicts[0]?.mine).toEqual({ name: 'W1', rate: 210, note: 'as built' })
  })

  it('may keep mine, which is saved on top of theirs', async () => {
    const { store, sent } = pageWith({ answers: [conflict] })
    store.apply([set('a', 'rate', 210)])
    await store.save()
    store.resolve('a', { ...w1, rate: 210 })
    await store.save()
    expect(sent[1]).toEqual([{ op: 'edit', kind: 'well', id: 'a', version: 2, body: { ...w1, rate: 210 } }])
  })

  it('may take theirs, which needs no save', async () => {
    const { store, sent, bodies } = pageWith({ answers: [conflict] })
    store.apply([set('a', 'rate', 210)])
    await store.save()
    store.resolve('a', theirs.body)
    await store.save()
    expect(sent).toHaveLength(1)
    expect(bodies()[0]).toEqual(theirs.body)
    expect(store.snapshot().unsaved).toBe(false)
  })

  it('need not choose when both came to the same value', async () => {
    const { store } = pageWith({ answers: [conflict] })
    store.apply([set('a', 'rate', 500)])
    await store.save()
    expect(store.snapshot()).toMatchObject({ conflicts: [], unsaved: false })
  })

  it('keep their drafts on top when the page reads the book again', () => {
    const { store, bodies } = pageWith()
    store.apply([set('a', 'rate', 210)])
    store.refresh([row('a', 2, theirs.body), row('b', 5, { ...w2, rate: 7 }), row('c', 1, w1)])
    expect(bodies()).toEqual([{ ...w1, rate: 210 }, { ...w2, rate: 7 }, w1])
  })
})

describe('when a save comes to nothing', () => {
  it('the changes stay, and go with the next try', async () => {
    const { store, sent } = pageWith({ answers: [{ kind: 'unreachable' }] })
    store.apply([set('a', 'rate', 210)])
    await store.save()
    expect(store.snapshot().saving).toMatchObject({ state: 'failed', retries: true })
    await store.save()
    expect(sent).toHaveLength(2)
    expect(store.snapshot().unsaved).toBe(false)
  })

  it('a refused deletion brings the row back with the reason', async () => {
    const message = 'Not deleted: zone Site needs it. Choose another there first.'
    const { store, bodies } = pageWith({
      answers: [
        { kind: 'answer', answer: { ok: false, problems: [{ id: 'b', field: '', message }], conflicts: [] } },
      ],
    })
    store.apply([{ op: 'delete', id: 'b' }])
    await store.save()
    expect(bodies()).toEqual([w1, w2])
    expect(store.snapshot().rows[1]?.problems[0]?.message).toBe(message)
    expect(store.snapshot().unsaved).toBe(false)
  })

  it('a page that is loaded again has everything that was not saved yet', () => {
    const shelf = { text: null as string | null }
    const before = pageWith({ shelf })
    before.store.apply([
      { op: 'set', id: 'a', cells: { rate: { ok: false, text: 'lots', message: 'not a number' } } },
      { op: 'delete', id: 'b' },
      { op: 'add', id: 'c', kind: 'well', body: { name: 'W3' }, cells: {} },
    ])
    const after = pageWith({ shelf })
    after.store.restore()
    expect(after.store.snapshot().rows.map((one) => one.id)).toEqual(['a', 'c'])
    expect(after.store.snapshot().rows[0]?.typed.rate?.text).toBe('lots')
  })

  it('a draft that waited while somebody else changed the row is saved against the version it was made on', async () => {
    const shelf = { text: null as string | null }
    const before = pageWith({ shelf })
    before.store.apply([set('a', 'rate', 210)])
    const after = pageWith({ shelf })
    after.store.refresh([row('a', 9, { ...w1, rate: 1 }), row('b', 4, w2)])
    after.shelf.text = JSON.stringify({
      changed: [
        { id: 'a', kind: 'well', body: { ...w1, rate: 210 }, typed: {}, base: { version: 1, body: w1 } },
      ],
      deleted: [],
    })
    after.store.restore()
    await after.store.save()
    expect(after.sent[0]).toMatchObject([{ op: 'edit', id: 'a', version: 1 }])
  })
})
