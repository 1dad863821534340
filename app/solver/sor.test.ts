import { describe, expect, it } from 'vitest'
import { sweepNine } from './sor'

describe('a sweep over nine points', () => {
  it('is successive over-relaxation of the full matrix, colour after colour', () => {
    const [nx, ny] = [5, 4]
    const count = nx * ny
    let state = 7
    const random = () => {
      state = (state * 16807) % 2147483647
      return state / 2147483647
    }
    const links = {
      west: new Float64Array(count),
      east: new Float64Array(count),
      south: new Float64Array(count),
      north: new Float64Array(count),
      southWest: new Float64Array(count),
      southEast: new Float64Array(count),
      northWest: new Float64Array(count),
      northEast: new Float64Array(count),
    }
    const steps: [keyof typeof links, number, number][] = [
      ['west', -1, 0],
      ['east', 1, 0],
      ['south', 0, -1],
      ['north', 0, 1],
      ['southWest', -1, -1],
      ['southEast', 1, -1],
      ['northWest', -1, 1],
      ['northEast', 1, 1],
    ]
    const full = Array.from({ length: count }, () => new Float64Array(count))
    for (let c = 0; c < count; c++) {
      const [i, j] = [c % nx, Math.floor(c / nx)]
      for (const [name, di, dj] of steps) {
        if (i + di < 0 || i + di >= nx || j + dj < 0 || j + dj >= ny) continue
        links[name][c] = 0.3 * random() - 0.1
        ;(full[c] as Float64Array)[c + dj * nx + di] = links[name][c] as number
      }
    }
    const b = Float64Array.from({ length: count }, random)
    const start = Float64Array.from({ length: count }, random)
    const x = new Float64Array(count + 2 * nx + 1)
    x.set(start, nx)
    const { west, east, south, north, ...corners } = links
    sweepNine(x, b, west, east, south, north, corners, nx, ny, 1.4)
    const slow = start.slice()
    for (const [column, row] of [
      [0, 0],
      [1, 0],
      [0, 1],
      [1, 1],
    ]) {
      for (let c = 0; c < count; c++) {
        if ((c % nx) % 2 !== column || Math.floor(c / nx) % 2 !== row) continue
        const sum = (full[c] as Float64Array).reduce(
          (total, link, k) => total + link * (slow[k] as number),
          0,
        )
        slow[c] = (slow[c] as number) + 1.4 * ((b[c] as number) + sum - (slow[c] as number))
      }
    }
    for (let c = 0; c < count; c++)
      expect(Math.abs((x[c + nx] as number) - (slow[c] as number))).toBeLessThan(1e-14)
  })
})
