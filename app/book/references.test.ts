import { describe, expect, it } from 'vitest'
import { joinNames, referenceLines } from './references'

describe('the reference margin', () => {
  it('writes a run of numbered names with a dash', () => {
    expect(joinNames(['W1', 'W2', 'W3', 'W7', 'Pump sump'])).toBe('W1–W3, W7, Pump sump')
    expect(joinNames(['W1', 'W2'])).toBe('W1, W2')
    expect(joinNames(['W9', 'W10', 'W11'])).toBe('W9–W11')
  })

  it('names each source once, with the rows it stands behind', () => {
    const rows = ['W1', 'W2', 'W3'].map((name) => ({
      name,
      source: 'Record sheets',
      recordedFrom: '2026-03-01',
    }))
    const lone = { name: 'W4', source: '', recordedFrom: '2026-03-01' }
    expect(referenceLines('3.1', [...rows, lone], null)).toEqual([
      { no: '3.1 W1–W3', text: 'Record sheets', changed: false },
    ])
  })

  it('marks a source whose row changed after the check', () => {
    const rows = [{ name: 'W1', source: 'Record sheets', recordedFrom: '2026-03-02T10:00:00.000Z' }]
    const [line] = referenceLines('3.1', rows, new Date('2026-03-01T10:00:00Z'))
    expect(line?.changed).toBe(true)
  })
})
