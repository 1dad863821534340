import { describe, expect, it } from 'vitest'
import { labelSides, symbolScale } from './label-sides'

const well = (id: string, x: number, y: number) => ({ id, x, y, width: 24 })

describe('labels of symbols', () => {
  it('stand right of the symbol where there is room', () => {
    const sides = labelSides([well('W1', 0, 0), well('W2', 100, 0)], 8, 13)
    expect([...sides.values()]).toEqual(['right', 'right'])
  })

  it('turn to the other side of a symbol that has a neighbour', () => {
    const sides = labelSides([well('W1', 0, 0), well('W2', 30, 0)], 8, 13)
    expect(sides.get('W1')).toBe('left')
    expect(sides.get('W2')).toBe('right')
  })

  it('go above where both sides are taken', () => {
    const sides = labelSides([well('W1', -30, 0), well('W2', 0, 0), well('W3', 30, 0)], 8, 13)
    expect(sides.get('W2')).toBe('above')
  })

  it('find no room in the midst of a crowd', () => {
    const crowd = [-20, 0, 20].flatMap((y) => [-20, 0, 20].map((x) => well(`${x} ${y}`, x, y)))
    expect(labelSides(crowd, 8, 13).get('0 0')).toBeNull()
  })
})

describe('symbols', () => {
  it('become smaller where they crowd, but not too small to read', () => {
    const ring = (radius: number) =>
      Array.from({ length: 8 }, (_, i) => {
        const angle = (i * Math.PI) / 4
        return well(`W${i}`, radius * Math.cos(angle), radius * Math.sin(angle))
      })
    expect(symbolScale(ring(100), 28)).toBe(1)
    expect(symbolScale(ring(32), 28)).toBeCloseTo((2 * 32 * Math.sin(Math.PI / 8)) / 28, 9)
    expect(symbolScale(ring(5), 28)).toBe(0.7)
  })
})
