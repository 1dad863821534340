import { describe, expect, it } from 'vitest'
import { decodeHeads, encodeHeads } from './heads-buffer'

const grid = { columns: 2, rows: 1, xEdges: Float64Array.of(0, 1.5, 4), yEdges: Float64Array.of(-1, 2) }

describe('the heads buffer', () => {
  it('gives back edges and heads bit by bit, no ground as NaN', () => {
    const { grid: back, heads } = decodeHeads(encodeHeads(grid, Float64Array.of(0.1, Number.NaN)))
    expect(back).toEqual(grid)
    expect([...heads]).toEqual([0.1, Number.NaN])
  })

  it('holds the heads of several times, the last of them in front', () => {
    const fields = [0, 0.25, 30].map((time, k) => ({ time, heads: Float64Array.of(k, -k) }))
    const back = decodeHeads(encodeHeads(grid, fields))
    expect(back.grid).toEqual(grid)
    expect(back.fields).toEqual(fields)
    expect([...back.heads]).toEqual([2, -2])
    expect(decodeHeads(encodeHeads(grid, Float64Array.of(1, 2))).fields).toEqual([])
  })

  it('refuses times that do not rise, and no heads at all', () => {
    const at = (time: number) => ({ time, heads: Float64Array.of(1, 2) })
    expect(() => encodeHeads(grid, [at(1), at(1)])).toThrow(/times of the heads do not rise/)
    expect(() => encodeHeads(grid, [at(0), at(Number.NaN)])).toThrow(/do not rise/)
    expect(() => encodeHeads(grid, [])).toThrow(/no heads/)
    const bytes = new Uint8Array(encodeHeads(grid, [at(1), at(2)]))
    bytes[24 + 7] = 0x7f
    expect(() => decodeHeads(bytes)).toThrow(/times in the heads buffer do not rise/)
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
    expect(() => decodeHeads(changed(8, 3))).toThrow(/version 3/)
    // Of version 2, with no field in it.
    expect(() => decodeHeads(changed(8, 2))).toThrow(/bytes/)
    expect(() => decodeHeads(good.subarray(0, 40))).toThrow(/bytes/)
    expect(() => decodeHeads(good.subarray(0, 10))).toThrow(/cut short/)
    expect(() => decodeHeads(changed(24 + 7, 0x7f))).toThrow(/do not rise/)
    expect(() => encodeHeads(grid, Float64Array.of(1))).toThrow(/do not fit/)
  })
})
