/**
 * npm run bench
 *
 * Times steady plan solves by over-relaxation and prints a table: medians of five runs after one to warm up, set-up
 * and results included, in this process on one thread. Three problems on square grids: one material between four
 * fixed sides; conductivity that varies log-normally (sigma of ln K 2, four cells to a zone) with 20 wells; a
 * channel a thousand times as conductive beside a wall of 1e-6, held on one short stretch.
 */
import type { Boundary, Ground, Model, Position } from '~/solver/model'
import { solveModel } from '~/solver/solve'

const repeats = 5
const sizes = process.argv.length > 2 ? process.argv.slice(2).map(Number) : [64, 128, 256, 512]

/** Uniform numbers from 0 to 1, the same on every machine (linear congruence, Numerical Recipes' constants). */
function numbersFrom(seed: number): () => number {
  let state = seed
  return () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0
    return (state + 0.5) / 4294967296
  }
}

const corners: Position[] = [
  [0, 0],
  [1000, 0],
  [1000, 1000],
  [0, 1000],
]

function fixedSides(heads: [south: number, east: number, north: number, west: number]): Boundary[] {
  return heads.map((head, k) => ({
    name: `Side ${k + 1}`,
    kind: 'fixed head',
    line: [corners[k] as Position, corners[(k + 1) % 4] as Position],
    head,
  }))
}

function square(cells: number, changes: Partial<Model>): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 1000], y: [0, 1000] },
    grid: { columns: cells, rows: cells },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 10, ky: 10 }],
    ground: [{ material: 'Sand', base: -20, top: 0 }],
    boundaries: fixedSides([11, 10, 11, 12]),
    recharge: [{ name: 'Rain', rate: 0.001 }],
    ...changes,
  }
}

function homogeneous(cells: number): Model {
  return square(cells, {})
}

function varied(cells: number): Model {
  const next = numbersFrom(7)
  const zones = cells / 4
  const width = 1000 / zones
  const names = 64
  const normal = () => Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next())
  const materials = Array.from({ length: names }, (_, k) => {
    const conductivity = 10 * Math.exp(2 * normal())
    return { name: `Sand ${k}`, kx: conductivity, ky: conductivity }
  })
  const ground: Ground[] = []
  for (let j = 0; j < zones; j++) {
    for (let i = 0; i < zones; i++) {
      const [x, y] = [i * width, j * width]
      ground.push({
        material: `Sand ${Math.floor(next() * names)}`,
        polygon: [
          [x, y],
          [x + width, y],
          [x + width, y + width],
          [x, y + width],
        ],
        base: -20,
        top: 0,
      })
    }
  }
  const wells = Array.from({ length: 20 }, (_, k) => ({
    name: `W${k}`,
    x: 50 + 900 * next(),
    y: 50 + 900 * next(),
    kind: 'abstraction' as const,
    rate: 50,
  }))
  return square(cells, { materials, ground, wells })
}

function walled(cells: number): Model {
  return square(cells, {
    materials: [
      { name: 'Sand', kx: 10, ky: 1 },
      { name: 'Channel', kx: 10_000, ky: 1000 },
    ],
    ground: [
      { material: 'Sand', base: -20, top: 0 },
      {
        material: 'Channel',
        polygon: [
          [0, 400],
          [1000, 550],
          [1000, 600],
          [0, 450],
        ],
        base: -20,
        top: 0,
      },
    ],
    walls: [
      {
        name: 'Box',
        line: [
          [200, 600],
          [500, 650],
          [480, 900],
          [180, 850],
          [200, 600],
        ],
        thickness: 1,
        k: 1e-6,
      },
    ],
    boundaries: [
      {
        name: 'Pond',
        kind: 'fixed head',
        line: [
          [0, 0],
          [0, 40],
        ],
        head: 10,
      },
    ],
  })
}

function median(values: number[]): number {
  return [...values].sort((a, b) => a - b)[Math.floor(values.length / 2)] as number
}

const problems: [string, (cells: number) => Model][] = [
  ['one material', homogeneous],
  ['log-normal K, 20 wells', varied],
  ['walls and channel', walled],
]

console.log('problem                  cells        seconds  sweeps  residual  head error  converged')
for (const [name, problem] of problems) {
  for (const cells of sizes) {
    const model = problem(cells)
    const seconds: number[] = []
    let result = solveModel(model).result
    for (let k = 0; k < repeats; k++) {
      const started = performance.now()
      result = solveModel(model).result
      seconds.push((performance.now() - started) / 1000)
    }
    console.log(
      [
        name.padEnd(24),
        `${cells} x ${cells}`.padEnd(11),
        median(seconds).toFixed(3).padStart(8),
        String(result.iterations).padStart(7),
        result.residual.toExponential(1).padStart(9),
        result.headError.toExponential(1).padStart(11),
        result.converged ? '  yes' : '  no',
      ].join(' '),
    )
  }
}
