import { describe, expect, test } from 'vitest'
import { drawdownColour, headColour, lineOn, residualColour, toHex, typeOn } from './ramp'

/** Relative luminance and contrast ratio of WCAG 2.2. */
function luminance(hex: string): number {
  const [r = 0, g = 0, b = 0] = [1, 3, 5].map((at) => {
    const value = Number.parseInt(hex.slice(at, at + 2), 16) / 255
    return value <= 0.04045 ? value / 12.92 : ((value + 0.055) / 1.055) ** 2.4
  })
  return 0.2126 * r + 0.7152 * g + 0.0722 * b
}
function contrast(a: string, b: string): number {
  const [light, dark] = [luminance(a), luminance(b)].sort((x, y) => y - x)
  return ((light as number) + 0.05) / ((dark as number) + 0.05)
}

describe('colours of figures', () => {
  test('the primaries of sRGB come back from their published OKLCH values', () => {
    expect(toHex({ l: 1, c: 0, h: 0 })).toBe('#ffffff')
    expect(toHex({ l: 0, c: 0, h: 0 })).toBe('#000000')
    expect(toHex({ l: 0.62796, c: 0.25768, h: 29.234 })).toBe('#ff0000')
    expect(toHex({ l: 0.86644, c: 0.29483, h: 142.495 })).toBe('#00ff00')
    expect(toHex({ l: 0.45201, c: 0.31321, h: 264.052 })).toBe('#0000ff')
  })

  test('heads grow lighter all the way, in luminance as well as in OKLCH', () => {
    for (let i = 0; i < 100; i++) {
      expect(headColour((i + 1) / 100).l).toBeGreaterThan(headColour(i / 100).l)
      expect(luminance(toHex(headColour((i + 1) / 100)))).toBeGreaterThanOrEqual(
        luminance(toHex(headColour(i / 100))),
      )
    }
  })

  test('drawdown darkens from chalk, and a rise is told from it by hue', () => {
    for (let i = 0; i < 20; i++) expect(drawdownColour((i + 1) / 20).l).toBeLessThan(drawdownColour(i / 20).l)
    expect(drawdownColour(1).h).toBeLessThan(60)
    expect(drawdownColour(-1).h).toBeGreaterThan(180)
  })

  test('residuals of equal size have nearly equal weight on either side of chalk', () => {
    for (const size of [0, 0.5, 1]) {
      expect(Math.abs(residualColour(size).l - residualColour(-size).l)).toBeLessThan(0.05)
    }
  })

  test('type and contour lines keep their contrast along the whole ramp, low heads included', () => {
    for (let i = 0; i <= 50; i++) {
      const fill = headColour(i / 50)
      expect(contrast(toHex(fill), toHex(typeOn(fill)))).toBeGreaterThanOrEqual(4.5)
      expect(contrast(toHex(fill), toHex(lineOn(fill)))).toBeGreaterThan(1.9)
    }
  })
})
