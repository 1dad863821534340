import { describe, expect, it } from 'vitest'
import type { Boundary, Model, Position, Well } from './model'
import { ModelError } from './model-error'
import { solveModel } from './solve'
import { reachInThicknesses, steepestWaterTable } from './vertical-flow'

function side(name: string, x: number, head: number, length = 300): Boundary {
  return {
    name,
    kind: 'fixed head',
    line: [
      [x, 0],
      [x, length],
    ],
    head,
  }
}

/** 300 x 300 m of sand on clay at 0 m, water table at 10 m in the west and east. */
function sandOnClay(changes: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'unconfined',
    extent: { x: [0, 300], y: [0, 300] },
    grid: { columns: 60, rows: 60 },
    time: { kind: 'steady' },
    materials: [
      { name: 'Sand', kx: 10, ky: 10, specificStorage: 1e-5, specificYield: 0.2 },
      { name: 'Silt', kx: 0.01, ky: 0.01 },
    ],
    ground: [{ material: 'Sand', base: 0 }],
    boundaries: [side('West', 0, 10), side('East', 300, 10)],
    ...changes,
  }
}

const toAccept = (model: Model) =>
  solveModel(model).result.warnings.filter((warning) => warning.accept === true)
const codes = (model: Model) => toAccept(model).map(({ code }) => code)

const wallAcross: Position[] = [
  [150, -1],
  [150, 301],
].map(([x, y]) => [x as number, Math.min(300, Math.max(0, y as number))])

function pumped(changes: Partial<Well> = {}): Well {
  return { name: 'W1', x: 151, y: 149, kind: 'abstraction', rate: 300, radius: 0.15, ...changes }
}

describe('a wall that hangs', () => {
  const wall = { name: 'Cut-off', line: wallAcross, thickness: 0.8, k: 1e-4 }
  const gradient = { boundaries: [side('West', 0, 11), side('East', 300, 10)] }

  it('is told when its toe lies above the base of the ground, with what the ground under it transmits', () => {
    const [warning] = toAccept(sandOnClay({ ...gradient, walls: [{ ...wall, toe: 4 }] }))
    expect(warning).toMatchObject({ code: 'hanging-wall', severity: 'check' })
    expect(warning?.text).toContain('"Cut-off" ends at 4 m, up to 4 m above the base')
    // 4 m of about 10 m.
    expect(warning?.text).toMatch(/: (36|37|38|39|40) % of what the ground transmits/)
    expect(warning?.text).toContain('vertical section')
  })

  it('is told when only one end of it misses a base that falls', () => {
    const falling = {
      xyz: [
        [0, 0, 0],
        [300, 0, 0],
        [0, 300, -6],
        [300, 300, -6],
      ] as [number, number, number][],
    }
    const ground = [{ material: 'Sand', base: falling }]
    expect(codes(sandOnClay({ ...gradient, ground, walls: [{ ...wall, toe: -3 }] }))).toEqual([
      'hanging-wall',
    ])
    expect(codes(sandOnClay({ ...gradient, ground, walls: [{ ...wall, toe: -7 }] }))).toEqual([])
  })

  it('is not told of a wall that reaches the base, or of one whose toe nobody gave', () => {
    for (const toe of [0, -2]) {
      const { warnings } = solveModel(sandOnClay({ ...gradient, walls: [{ ...wall, toe }] })).result
      expect(warnings.map(({ code }) => code)).not.toContain('hanging-wall')
      // That its toe matters need not be said of a wall that gives it.
      expect(warnings.map(({ code }) => code)).not.toContain('wall-full-depth')
    }
    const { warnings } = solveModel(sandOnClay({ ...gradient, walls: [wall] })).result
    expect(warnings.map(({ code }) => code)).toContain('wall-full-depth')
    expect(warnings.filter(({ accept }) => accept)).toEqual([])
  })

  it('does not depend on the datum', () => {
    const raised = sandOnClay({
      ground: [{ material: 'Sand', base: 1000 }],
      boundaries: [side('West', 0, 1011), side('East', 300, 1010)],
      walls: [{ ...wall, toe: 1004 }],
    })
    expect(codes(raised)).toEqual(['hanging-wall'])
  })
})

describe('a well open over part of the depth', () => {
  const screen = { top: 9, bottom: 6 }

  it('is told with the results that would differ', () => {
    const near = { name: 'P1', x: 151 + reachInThicknesses * 9 - 3, y: 149 }
    const far = { name: 'P2', x: 151 + reachInThicknesses * 10 + 1, y: 149 }
    const [warning] = toAccept(sandOnClay({ wells: [pumped({ screen })], points: [near, far] }))
    expect(warning?.code).toBe('part-screen')
    expect(warning?.text).toContain('the head at the well face and the head at "P1"')
    expect(warning?.text).not.toContain('P2')
  })

  it('is not told when it is open over nearly the whole depth, does not run, or moves no result', () => {
    expect(codes(sandOnClay({ wells: [pumped({ screen: { top: 12, bottom: 0.5 } })] }))).toEqual([])
    expect(codes(sandOnClay({ wells: [pumped()] }))).toEqual([])
    expect(codes(sandOnClay({ wells: [pumped({ screen, rate: 0 })] }))).toEqual([])
    expect(codes(sandOnClay({ wells: [pumped({ screen, radius: undefined })] }))).toEqual([])
  })

  it('reaches further in layered ground, where less flows across the layers than along them', () => {
    const layers = [
      { material: 'Sand', base: 6, top: 8 },
      { material: 'Silt', base: 5, top: 6 },
      { material: 'Sand', base: 0, top: 5 },
    ]
    const layered = sandOnClay({
      flow: 'confined',
      ground: [{ layers }],
      wells: [pumped({ rate: 20, radius: undefined, screen: { top: 8, bottom: 6 } })],
      points: [{ name: 'P1', x: 240, y: 149 }],
    })
    expect(codes(layered)).toEqual(['part-screen'])
    expect(codes({ ...layered, ground: [{ material: 'Sand', base: 0, top: 8 }] })).toEqual([])
  })
})

describe('a water table in plan', () => {
  const dam = (length: number, high: number, low: number) =>
    sandOnClay({
      extent: { x: [0, length], y: [0, 20] },
      grid: { columns: 50, rows: 4 },
      boundaries: [side('Upstream', 0, high, 20), side('Downstream', length, low, 20)],
    })

  it('is told to be too steep for Dupuit in a short dam, and not in a long one', () => {
    const [warning] = toAccept(dam(20, 10, 2))
    expect(warning?.code).toBe('steep-water-table')
    expect(warning?.text).toContain(`1 in ${1 / steepestWaterTable}`)
    // 8 m over 20 m; between the outer centres a little less.
    expect(warning?.text).toMatch(/falls by 1 in 2\.[45]/)
    expect(codes(dam(60, 10, 2))).toEqual([])
    expect(codes(dam(300, 10, 0.5))).toEqual([])
  })

  it('is not told to be steep for the cone of a well, a wall, or a river that stands low', () => {
    expect(codes(sandOnClay({ wells: [pumped({ rate: 250 })] }))).toEqual([])
    expect(
      codes(
        sandOnClay({
          boundaries: [side('West', 0, 14), side('East', 300, 8)],
          walls: [{ name: 'Cut-off', line: wallAcross, thickness: 1, k: 1e-5 }],
        }),
      ),
    ).toEqual([])
  })

  it('is told where a drain or a well draws it to the base', () => {
    const drain: Boundary = {
      name: 'Ditch',
      kind: 'drain',
      line: [
        [150, 0],
        [150, 300],
      ],
      level: 0.1,
      conductance: 20,
    }
    const drained = toAccept(sandOnClay({ boundaries: [side('West', 0, 10), side('East', 300, 10), drain] }))
    expect(drained.map(({ code }) => code)).toEqual(['drawn-to-the-base'])
    expect(drained[0]?.text).toContain('The drain "Ditch"')
    const dry = toAccept(sandOnClay({ wells: [pumped({ rate: 5000 })] }))
    expect(dry.map(({ code }) => code)).toEqual(['drawn-to-the-base'])
    expect(dry[0]?.text).toContain('The well "W1"')
  })

  it('is told where a dig lowers it by a good part of its depth within that depth', () => {
    const dig = (head: number): Boundary => ({
      name: 'Dig',
      kind: 'fixed head',
      polygon: [
        [130, 130],
        [170, 130],
        [170, 170],
        [130, 170],
      ],
      head,
    })
    const near = [side('West', 0, 10), side('East', 300, 10)]
    expect(codes(sandOnClay({ boundaries: [...near, dig(1)] }))).toContain('steep-edge')
    expect(codes(sandOnClay({ boundaries: [...near, dig(7)] }))).toEqual([])
    // Confined, the flow stays horizontal unless the dig drains the ground below its top.
    const confined: Partial<Model> = { flow: 'confined', ground: [{ material: 'Sand', base: -10, top: 0 }] }
    const high = [side('West', 0, 60), side('East', 300, 60)]
    expect(codes(sandOnClay({ ...confined, boundaries: [...high, dig(1)] }))).toEqual([])
    expect(codes(sandOnClay({ ...confined, boundaries: [...high, dig(-5)] }))).toEqual(['steep-edge'])
  })

  it('is told of the stage in which it is steepest', () => {
    const model: Model = {
      ...dam(20, 10, 9),
      boundaries: [
        side('Upstream', 0, 10, 20),
        { ...side('Downstream', 20, 9, 20), kind: 'fixed head', head: { stages: [9, 2] } },
      ],
      time: {
        kind: 'transient',
        initialHead: 'steady',
        stages: [
          { name: 'Before', duration: 1 },
          { name: 'Drawn down', duration: 200, firstStep: 1, growth: 1.3 },
        ],
      },
    }
    const warnings = toAccept(model)
    expect(warnings.map(({ code }) => code)).toEqual(['steep-water-table'])
    expect(warnings[0]?.text).toContain('at time 201 d')
  })
})

describe('a toe or a screen that cannot be', () => {
  const refused = (model: Model) => {
    try {
      solveModel(model)
    } catch (error) {
      if (error instanceof ModelError) return error.path
      throw error
    }
    return null
  }

  it('is refused with its place', () => {
    expect(refused(sandOnClay({ wells: [pumped({ screen: { top: 3, bottom: 3 } })] }))).toBe(
      'wells[0].screen',
    )
    expect(refused(sandOnClay({ wells: [pumped({ screen: { top: Number.NaN, bottom: 3 } })] }))).toBe(
      'wells[0].screen.top',
    )
    const section: Partial<Model> = { kind: 'section', flow: 'saturated', ground: [{ material: 'Sand' }] }
    const wall = { name: 'Cut-off', line: wallAcross, thickness: 1, k: 0, toe: 2 }
    expect(refused(sandOnClay({ ...section, walls: [wall] }))).toBe('walls[0].toe')
  })
})
