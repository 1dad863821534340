import { describe, expect, test } from 'vitest'
import type { Vertex } from '~/book/field'
import { type Box, boxOf, overlap, typeWidth } from './boxes'
import { labelsAlong, upright } from './labels'
import { brokenText, layoutOf, scaleBarLength, ticksOf } from './layout'
import { clippedLine, clippedPolygon, hatchOf, simplified } from './lines'
import {
  contouringOf,
  headsPicture,
  headsPictureSvg,
  type PictureFeatures,
  type PictureInput,
  pictureLayout,
} from './picture'

const noFeatures: PictureFeatures = {
  wells: [],
  rechargeZones: [],
  boundaries: [],
  walls: [],
  points: [],
  rings: [],
  noFlowEdges: [],
}

function even(from: number, to: number, cells: number): Float64Array {
  return Float64Array.from({ length: cells + 1 }, (_, i) => from + ((to - from) * i) / cells)
}

function site(cells = 60, changes: Partial<PictureInput> = {}): PictureInput {
  const xEdges = even(531_000, 531_600, cells)
  const yEdges = even(178_000, 178_400, cells)
  const heads = Float64Array.from({ length: cells * cells }, (_, cell) => {
    const x = (cell % cells) - cells / 2
    const y = Math.floor(cell / cells) - cells / 2
    return 12 + y / (cells / 4) + Math.log((Math.hypot(x, y) + 1) / cells)
  })
  return {
    xEdges,
    yEdges,
    heads,
    field: 'head',
    unit: 'm',
    datum: 'm above site datum',
    converged: true,
    features: {
      ...noFeatures,
      wells: [{ name: 'W1', x: 531_300, y: 178_200, kind: 'abstraction' }],
      rechargeZones: [{ name: 'North basin', polygon: ring(531_050, 178_250, 120, 100) }],
      boundaries: [
        {
          name: 'Mere brook',
          kind: 'head-dependent flux',
          line: [
            [530_900, 178_040],
            [531_700, 178_060],
          ],
        },
      ],
      walls: [
        {
          name: 'Cut-off',
          line: [
            [531_350, 178_150],
            [531_350, 178_250],
          ],
        },
      ],
      points: [{ name: 'P7', x: 531_480, y: 178_130, kind: 'instrument' }],
      noFlowEdges: ['east', 'part of north'],
    },
    ...changes,
  }
}

function ring(x: number, y: number, width: number, height: number): Vertex[] {
  return [
    [x, y],
    [x + width, y],
    [x + width, y + height],
    [x, y + height],
  ]
}

function textsOf(svg: string): string[] {
  return [...svg.matchAll(/<text[^>]*>([^<]*)<\/text>/g)].map(([, text]) => text ?? '')
}

describe('the picture of heads', () => {
  test('names what it draws, labels its contours, and says what levels are measured from', () => {
    const texts = textsOf(headsPictureSvg(site(), { width: 760, theme: 'print' }))
    expect(texts).toEqual(
      expect.arrayContaining(['W1', 'P7', 'Cut-off', 'Mere brook', 'North basin', 'N', '12.0']),
    )
    expect(texts).toEqual(
      expect.arrayContaining([
        'abstraction well',
        'piezometer',
        'head-dependent flux',
        'cut-off wall',
        'recharge zone',
        'no-flow edge',
      ]),
    )
    expect(texts.some((text) => text.startsWith('Head, m above site datum: '))).toBe(true)
    expect(texts).not.toContain('NOT CONVERGED')
  })

  test('says across the figure that a run did not converge', () => {
    expect(
      textsOf(headsPictureSvg(site(60, { converged: false }), { width: 500, theme: 'light' })),
    ).toContain('NOT CONVERGED')
  })

  test('needs nothing that a PDF would lose: no clipping paths, no patterns, six-digit colours only', () => {
    const svg = headsPictureSvg(site(), { width: 760, theme: 'print' })
    expect(svg).not.toMatch(/clip-?path|<pattern|<image|<foreignObject/i)
    const colours = [...svg.matchAll(/#[0-9a-fA-F]+\b/g)].map(([colour]) => colour)
    expect(colours.length).toBeGreaterThan(20)
    for (const colour of colours) expect(colour).toMatch(/^#[0-9a-f]{6}$/i)
    expect(svg).not.toMatch(/NaN|undefined|Infinity/)
    expect(svg).toContain("font-family:'Source Sans 3'")
  })

  test('draws to one scale in both directions and turns pixels back into coordinates', () => {
    for (const width of [340, 760, 1200]) {
      const layout = pictureLayout(site(), { width, theme: 'light' })
      expect(layout.plot.width / 600).toBeCloseTo(layout.plot.height / 400, 9)
      const [x, y] = layout.toGround(...layout.toPixel(531_123, 178_321))
      expect(x).toBeCloseTo(531_123, 6)
      expect(y).toBeCloseTo(178_321, 6)
      expect(
        layout.keys.every(({ x: at, item }) => at + layout.sampleWidth + typeWidth(item.label, 12) < width),
      ).toBe(true)
    }
  })

  test('a height that was asked for is kept, and one without room for a plot is refused', () => {
    expect(pictureLayout(site(), { width: 700, height: 420, theme: 'light' }).height).toBe(420)
    expect(() => pictureLayout(site(), { width: 700, height: 120, theme: 'light' })).toThrow(/no room/)
  })

  test('a field without any head is drawn as an empty plot, and a level one in a single colour', () => {
    const empty = site(10)
    empty.heads.fill(Number.NaN)
    expect(textsOf(headsPictureSvg(empty, { width: 500, theme: 'light' }))).toContain('outside the model')
    const level = site(10)
    level.heads.fill(7)
    expect(contouringOf(level)?.levels).toEqual([])
    expect(textsOf(headsPictureSvg(level, { width: 500, theme: 'light' }))).toContain(
      'Head, m above site datum: 7.0 to 7.0',
    )
  })

  test('residuals are printed with their sign and what it means', () => {
    const residuals = [
      { name: 'P7', x: 531_480, y: 178_130, value: 0.31, label: '+0.31' },
      { name: 'P8', x: 531_150, y: 178_130, value: -0.12, label: '−0.12' },
    ]
    const texts = textsOf(
      headsPictureSvg(site(60, { field: 'residual', residuals }), { width: 760, theme: 'print' }),
    )
    expect(texts).toEqual(
      expect.arrayContaining(['P7 +0.31', 'P8 −0.12', 'Residual = measured − modelled, m']),
    )
  })

  test('rounding where nothing is drawn down makes no contour of zero', () => {
    const calm = site(40, { field: 'drawdown' })
    calm.heads.forEach((_, cell) => {
      calm.heads[cell] = cell < 800 ? -1e-9 * (cell % 3) : cell / 400
    })
    expect(contouringOf(calm)?.levels[0]).toBeGreaterThan(0)
  })

  test('a page gets the same layers as the PDF', () => {
    const option = headsPicture(site(), { width: 760, theme: 'light' })
    const [series] = option.series as { type: string; data: unknown[] }[]
    expect(series?.type).toBe('custom')
    expect(series?.data.length).toBeGreaterThan(10)
  })

  test('512 x 512 cells are drawn within a second of computing', () => {
    headsPictureSvg(site(), { width: 850, theme: 'print' })
    // The best of three fresh fields: a busy machine slows any single one.
    const times = [1, 2, 3].map(() => {
      const input = site(512)
      const start = process.cpuUsage()
      headsPictureSvg(input, { width: 850, theme: 'print' })
      return process.cpuUsage(start).user
    })
    expect(Math.min(...times)).toBeLessThan(1_000_000)
  })
})

describe('labels', () => {
  const plot = { left: 0, top: 0, width: 800, height: 400 }
  const line: Vertex[] = Array.from({ length: 81 }, (_, k) => [k * 10, 200 + 30 * Math.sin(k / 8)])

  test('stand on their contour, the right way up, and clear of symbols and of each other', () => {
    const symbols: Box[] = [boxOf(400, 200, 300, 90)]
    const taken = [...symbols]
    const labels = labelsAlong(line, { text: '12.5', size: 12, plot, taken, suits: () => true })
    expect(labels.length).toBeGreaterThan(0)
    for (const { box } of labels) {
      expect(symbols.some((symbol) => overlap(symbol, box))).toBe(false)
      expect(Math.abs(box.angle)).toBeLessThanOrEqual(Math.PI / 2)
      expect(Math.min(...line.map(([x, y]) => Math.hypot(x - box.x, y - box.y)))).toBeLessThan(6)
    }
    const again = labelsAlong(line, { text: '12.5', size: 12, plot, taken, suits: () => true })
    for (const { box } of again) {
      for (const { box: first } of labels) expect(overlap(box, first)).toBe(false)
    }
  })

  test('are left out of rings too short to carry them', () => {
    const small: Vertex[] = ring(100, 100, 12, 12)
    expect(labelsAlong(small, { text: '12.5', size: 12, plot, taken: [], suits: () => true })).toEqual([])
  })

  test('never stand on their heads', () => {
    expect(upright(Math.PI)).toBeCloseTo(0)
    expect(upright((3 * Math.PI) / 4)).toBeCloseTo(-Math.PI / 4)
    expect(upright(-0.3)).toBe(-0.3)
  })

  test('turned boxes overlap only where they meet', () => {
    const long = boxOf(0, 0, 100, 10, Math.PI / 4)
    expect(overlap(long, boxOf(30, -30, 20, 20))).toBe(false)
    expect(overlap(long, boxOf(30, 30, 20, 20))).toBe(true)
    expect(overlap(boxOf(0, 0, 10, 10), boxOf(10, 0, 10, 10))).toBe(false)
  })
})

describe('lines of a figure', () => {
  const plot = { left: 0, top: 0, width: 100, height: 50 }

  test('are cut at the edge of the plot, into as many parts as lie inside', () => {
    const there: Vertex[] = [
      [-50, 25],
      [50, 25],
      [50, 80],
      [80, 80],
      [80, 10],
    ]
    expect(clippedLine(there, plot)).toEqual([
      [
        [0, 25],
        [50, 25],
        [50, 50],
      ],
      [
        [80, 50],
        [80, 10],
      ],
    ])
    expect(
      clippedLine(
        [
          [0, 0],
          [100, 0],
        ],
        plot,
      ),
    ).toHaveLength(1)
    expect(
      clippedLine(
        [
          [-5, -5],
          [105, -5],
        ],
        plot,
      ),
    ).toEqual([])
  })

  test('polygons are cut to the plot, and hatched inside only', () => {
    const cut = clippedPolygon(ring(-20, -20, 60, 40), plot)
    expect(cut).toEqual(
      expect.arrayContaining([
        [0, 0],
        [40, 0],
        [40, 20],
        [0, 20],
      ]),
    )
    const hatch = hatchOf(cut, 5)
    expect(hatch.length).toBeGreaterThan(5)
    for (const [x, y] of hatch.flat()) {
      expect(x).toBeGreaterThanOrEqual(-1e-9)
      expect(x).toBeLessThanOrEqual(40 + 1e-9)
      expect(y).toBeGreaterThanOrEqual(-1e-9)
      expect(y).toBeLessThanOrEqual(20 + 1e-9)
    }
  })

  test('lose only vertices that nobody would see', () => {
    const straight: Vertex[] = Array.from({ length: 50 }, (_, k) => [k, 2 * k])
    expect(simplified(straight, 0.1)).toHaveLength(2)
    const bent: Vertex[] = [...straight, [50, 50]]
    expect(simplified(bent, 0.1)).toHaveLength(3)
  })

  test('scale bars and ticks are round numbers that fit', () => {
    expect(scaleBarLength(0.8, 180)).toBe(200)
    expect(scaleBarLength(3, 180)).toBe(50)
    expect(ticksOf(531_013, 531_590, 1, 90)).toEqual({
      step: 100,
      ticks: [531_100, 531_200, 531_300, 531_400, 531_500],
    })
    expect(brokenText('one two three', 45, 12)).toEqual(['one two', 'three'])
    expect(
      layoutOf({ xEdges: even(0, 10, 1), yEdges: even(0, 10, 1) }, { width: 400 }, [], 'Fig. 5.1').caption,
    ).toHaveLength(1)
  })
})
