import { describe, expect, it } from 'vitest'
import type { Row } from '~/book/row'
import { wellSchema } from '~/water/water'
import { type Case, caseSchema, settingsOf } from './case'
import type { CaseInputs } from './freeze'
import { copyOfCase, firstBaseCase, freeName, sheetLines } from './sheet-lines'

const base: Case = caseSchema.parse({
  name: 'Base case',
  isBase: true,
  flow: 'confined',
  extent: { xMin: 0, xMax: 1000, yMin: -50, yMax: 600 },
  cellSize: { value: 5, unit: 'm' },
})
const blank: Case = caseSchema.parse({ name: 'Wet year' })

function row<Body>(id: string, kind: string, body: Body): Row<Body> {
  return {
    id,
    version: 1,
    kind,
    position: 1,
    body,
    recordedFrom: '2026-01-01T00:00:00Z',
    recordedBy: 'R. O.',
  }
}
const inputs: CaseInputs = {
  project: {
    number: 'P-1',
    title: 'North basin',
    crsEpsg: 27700,
    verticalDatum: 'site datum',
    units: { length: 'm', time: 'd' },
  },
  materials: [],
  zones: [],
  points: [],
  wells: [
    row(
      'w1',
      'well',
      wellSchema.parse({
        name: 'W1',
        x: 400,
        y: 300,
        kind: 'abstraction',
        rate: { value: 12.5, unit: 'l/s' },
      }),
    ),
  ],
  rechargeZones: [],
  boundaries: [],
  walls: [],
  cases: [row('base', 'case', base)],
}
const lines = sheetLines(inputs, base)
function line(key: string) {
  const found = lines.find((one) => one.key === key)
  if (!found) throw new Error(`There is no line ${key}.`)
  return found
}
function typed(key: string, body: Case, text: string): Case {
  const read = line(key).read(body, text)
  if (!read.ok) throw new Error(read.message)
  return caseSchema.parse({ ...body, ...read.set })
}

describe('The case sheet', () => {
  it('shows what the base case says in a cell that is blank', () => {
    expect(line('cellSize').own(blank)).toBe('')
    expect(line('cellSize').inherited(blank)).toBe('5')
    expect(line('yMin').inherited(blank)).toBe('−50')
    expect(line('w1 rate').inherited(blank)).toBe('12.5')
    expect(line('w1 rate').unit).toBe('l/s')
  })

  it('keeps a quantity of a case in the unit in which it was typed', () => {
    const set = typed('w1 rate', blank, '900 m³/d')
    expect(set.overrides).toEqual([{ rowId: 'w1', quantity: 'rate', value: { value: 900, unit: 'm3/d' } }])
    expect(line('w1 rate').own(set)).toBe('900 m³/d')
  })

  it('takes a blank back to the base case', () => {
    const set = typed('cellSize', typed('w1 rate', blank, '20'), '2')
    const back = typed('cellSize', typed('w1 rate', set, ''), '')
    expect(back).toEqual(blank)
  })

  it('lets a case move one side of the extent, and forgets it once it equals the base case again', () => {
    const wider = typed('xMax', blank, '1500')
    expect(settingsOf(base, wider).extent).toEqual({ xMin: 0, xMax: 1500, yMin: -50, yMax: 600 })
    expect(line('xMax').own(wider)).toBe('1500')
    expect(line('xMin').own(wider)).toBe('')
    expect(typed('xMax', wider, '1000').extent).toBeNull()
  })

  it('offers the methods in words, automatic unless somebody chooses', () => {
    expect(line('method').inherited(base)).toBe('automatic')
    expect(line('method').choices).toEqual(['automatic', 'successive over-relaxation', 'multigrid'])
    const relaxed = typed('method', blank, 'successive over-relaxation')
    expect([relaxed.method, line('method').own(relaxed)]).toEqual(['sor', 'successive over-relaxation'])
    expect(settingsOf(base, relaxed).method).toBe('sor')
    expect(typed('method', relaxed, '')).toEqual(blank)
    expect(line('method').read(blank, 'guess')).toMatchObject({ ok: false })
  })

  it('lets a case leave out the verification that the base case has', () => {
    expect(line('verify').inherited(base)).toBe('with error bands')
    const tried = typed('verify', blank, 'none')
    expect([tried.verify, line('verify').own(tried), line('verify').inherited(tried)]).toEqual([
      false,
      'none',
      'with error bands',
    ])
    expect(typed('verify', tried, '')).toEqual(blank)
    expect(line('verify').read(blank, 'perhaps')).toMatchObject({ ok: false })
  })

  it('refuses with the reason what cannot be read', () => {
    expect(line('xMax').read(blank, '-5')).toMatchObject({ ok: false })
    expect(line('w1 rate').read(blank, '-900')).toMatchObject({
      ok: false,
      message: expect.stringContaining('sign'),
    })
    expect(line('w1 rate').read(blank, '9 m')).toMatchObject({ ok: false })
    expect(line('flow').read(blank, 'both')).toMatchObject({ ok: false })
    expect(line('xMin').read(base, '')).toMatchObject({ ok: false })
  })

  it('counts the cells of each case', () => {
    expect(line('cells').own(base)).toBe('200 × 130 = 26\u202f000')
    expect(line('cells').own(typed('cellSize', blank, '10'))).toBe('100 × 65 = 6500')
  })

  it('copies the base case to one that inherits everything, another case with its differences', () => {
    expect(caseSchema.parse(copyOfCase(base, 'Case 1'))).toEqual(caseSchema.parse({ name: 'Case 1' }))
    const wet = typed('w1 rate', blank, '20')
    expect(copyOfCase(wet, 'Wetter')).toEqual({ ...wet, name: 'Wetter' })
  })

  it('finds a name that no case has', () => {
    expect(freeName([{ body: { name: 'Case 1' } }, { body: { name: 'Case 1 2' } }], 'Case 1')).toBe(
      'Case 1 3',
    )
  })

  it('starts a book off with an extent around what is drawn', () => {
    const first = caseSchema.parse(firstBaseCase(inputs))
    expect(first.extent).toEqual({ xMin: 400, xMax: 1400, yMin: 300, yMax: 1300 })
    expect(first.cellSize).toEqual({ value: 10, unit: 'm' })
  })
})

describe('A case', () => {
  it('refuses a unit that does not belong to the quantity it sets', () => {
    const wrong = { rowId: 'w1', quantity: 'rate', value: { value: 1, unit: 'm' } }
    expect(caseSchema.safeParse({ name: 'C', overrides: [wrong] }).success).toBe(false)
  })

  it('sets a quantity of a row once only', () => {
    const once = { rowId: 'w1', quantity: 'rate', value: { value: 1, unit: 'm3/d' } }
    expect(caseSchema.safeParse({ name: 'C', overrides: [once, once] }).success).toBe(false)
  })
})
