import { describe, expect, it } from 'vitest'
import { decodeHeads, encodeHeads } from './heads-buffer'

const grid = { columns: 2, rows: 1, xEdges: Float64Array.of(0, 1.5, 4), yEdges: Float64Array.of(-1, 2) }

describe('the heads buffer', () => {
  it('gives back edges and heads bit by bit, no ground as NaN', () => {
    const { grid: back, heads } = decodeHeads(encodeHeads(grid, Float64Array.of(0.1, Number.NaN)))
    expect(back).toEqual(grid)
    expect([...heads]).toEqual([0.1, Number.NaN])
  })

  it('is read from the middle of a larger buffer', () => {
    const bytes = new Uint8Array(encodeHeads(grid, Float64Array.of(1, 2)))
    const shifted = new Uint8Array(bytes.length + 3)
    shifted.set(bytes, 3)
    expect([...decodeHeads(shifted.subarray(3)).heads]).toEqual([1, 2])
  })

  it('refuses what is foreign, newer, cut short or has no rising edges', () => {
    const good = new Uint8Array(encodeHeads(grid, Float64Array.of(1, 2)))
    const changed = (at: number, value: number) => {
      const copy = good.slice()
      copy[at] = value
      return copy
    }
    expect(() => decodeHeads(changed(0, 0))).toThrow(/not a heads buffer/)
    expect(() => decodeHeads(changed(8, 2))).toThrow(/version 2/)
    expect(() => decodeHeads(good.subarray(0, 40))).toThrow(/bytes/)
    expect(() => decodeHeads(good.subarray(0, 10))).toThrow(/cut short/)
    expect(() => decodeHeads(changed(24 + 7, 0x7f))).toThrow(/do not rise/)
    expect(() => encodeHeads(grid, Float64Array.of(1))).toThrow(/do not fit/)
  })
})
