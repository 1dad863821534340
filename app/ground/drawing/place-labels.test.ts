import { describe, expect, it } from 'vitest'
import { placeLabels, symbolScale } from './place-labels'

const well = (id: string, x: number, y: number) => ({ id, x, y, width: 24 })

describe('labels of symbols', () => {
  it('stand right of the symbol where there is room', () => {
    const sides = placeLabels([well('W1', 0, 0), well('W2', 100, 0)], [], 8, 13).sides
    expect([...sides.values()]).toEqual(['right', 'right'])
  })

  it('turn to the other side of a symbol that has a neighbour', () => {
    const sides = placeLabels([well('W1', 0, 0), well('W2', 30, 0)], [], 8, 13).sides
    expect(sides.get('W1')).toBe('left')
    expect(sides.get('W2')).toBe('right')
  })

  it('go above where both sides are taken', () => {
    const sides = placeLabels([well('W1', -30, 0), well('W2', 0, 0), well('W3', 30, 0)], [], 8, 13).sides
    expect(sides.get('W2')).toBe('above')
  })

  it('find no room in the midst of a crowd', () => {
    const crowd = [-20, 0, 20].flatMap((y) => [-20, 0, 20].map((x) => well(`${x} ${y}`, x, y)))
    expect(placeLabels(crowd, [], 8, 13).sides.get('0 0')).toBeNull()
  })
})

describe('the label of a line', () => {
  const wall = (vertices: [number, number][]) => ({ id: 'wall', vertices, width: 80 })
  const placed = (symbols: ReturnType<typeof well>[], vertices: [number, number][]) =>
    placeLabels(symbols, [wall(vertices)], 8, 13).lines.get('wall')

  it('runs above its middle stretch', () => {
    const place = placed(
      [],
      [
        [0, 0],
        [100, 0],
        [200, 0],
        [300, 0],
      ],
    )
    expect(place).toEqual({ x: 150, y: -12.5, angle: 0 })
  })

  it('reads from below where the line stands upright, whichever way it was drawn', () => {
    for (const ends of [
      [0, 100],
      [100, 0],
    ]) {
      const place = placed(
        [],
        ends.map((y): [number, number] => [0, y]),
      )
      expect(place?.angle).toBeCloseTo(-Math.PI / 2, 9)
      expect(place?.x).toBeCloseTo(-12.5, 9)
    }
  })

  it('goes below the line, or along another stretch, where symbols stand in its way', () => {
    const line: [number, number][] = [
      [0, 0],
      [100, 0],
      [100, 100],
    ]
    expect(placed([well('W1', 50, -14)], line)?.y).toBe(12.5)
    const both = placed([well('W1', 50, -14), well('W2', 50, 14)], line)
    expect(both?.angle).toBeCloseTo(-Math.PI / 2, 9)
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
