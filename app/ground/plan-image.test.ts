import { describe, expect, it } from 'vitest'
import { placedPixel, planImageCorners, planImagePlacement } from './plan-image'

describe('a plan image placed by two known points', () => {
  it('lies north up where both points agree with an unturned picture', () => {
    const placement = planImagePlacement([
      { column: 150, row: 150, x: 482080, y: 105670 },
      { column: 1450, row: 825, x: 483120, y: 105130 },
    ])
    expect(placement.pixelSize).toBeCloseTo(0.8, 12)
    expect(placement.turn).toBeCloseTo(0, 12)
    expect(placedPixel(placement, 50, 987.5)).toEqual([expect.closeTo(482000, 6), expect.closeTo(105000, 6)])
    const [topLeft, , bottomRight] = planImageCorners(placement, 1600, 1100)
    expect(topLeft).toEqual([expect.closeTo(481960, 6), expect.closeTo(105790, 6)])
    expect(bottomRight).toEqual([expect.closeTo(483240, 6), expect.closeTo(104910, 6)])
  })

  it('turns with its points and keeps right angles, without mirroring the picture', () => {
    // The picture's top edge points north-east: 30 degrees from x.
    const turn = Math.PI / 6
    const ground = (column: number, row: number) => ({
      column,
      row,
      x: 1000 + 2 * (column * Math.cos(turn) + row * Math.sin(turn)),
      y: 500 + 2 * (column * Math.sin(turn) - row * Math.cos(turn)),
    })
    const placement = planImagePlacement([ground(10, 20), ground(410, 90)])
    expect(placement.turn).toBeCloseTo(turn, 12)
    expect(placement.pixelSize).toBeCloseTo(2, 12)
    const third = ground(77, 333)
    expect(placedPixel(placement, 77, 333)).toEqual([expect.closeTo(third.x, 9), expect.closeTo(third.y, 9)])
    // Down the picture is clockwise from along it.
    const cross = placement.xColumn * placement.yRow - placement.yColumn * placement.xRow
    expect(cross).toBeLessThan(0)
  })

  it('does not depend on which known point is named first', () => {
    const a = { column: 12, row: 900, x: 3, y: 4 }
    const b = { column: 700, row: 15, x: 250, y: 310 }
    const [one, other] = [planImagePlacement([a, b]), planImagePlacement([b, a])]
    for (const key of Object.keys(one) as (keyof typeof one)[]) expect(other[key]).toBeCloseTo(one[key], 9)
  })

  it('refuses two known points on the same pixel', () => {
    const a = { column: 5, row: 5, x: 0, y: 0 }
    expect(() => planImagePlacement([a, { ...a, x: 10 }])).toThrow('same pixel')
  })
})
