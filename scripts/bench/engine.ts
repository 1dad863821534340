import type { Kernels } from '../../app/solver/linear/kernels.ts'
import type { Boundary, Ground, Model, Position } from '../../app/solver/model.ts'
import { solveModel } from '../../app/solver/solve.ts'
import { numbersFrom } from './problems.ts'

const corners: Position[] = [
  [0, 0],
  [1000, 0],
  [1000, 1000],
  [0, 1000],
]

function side(name: string, k: number, head: number): Boundary {
  return {
    name,
    kind: 'fixed head',
    line: [corners[k] as Position, corners[(k + 1) % 4] as Position],
    head,
  }
}

/** Conductivity that varies log-normally (sigma of ln K 2, zones of side / 32) with 20 wells between two fixed sides. */
function varied(cells: number, changes: Partial<Model>): Model {
  const next = numbersFrom(7)
  const normal = () => Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next())
  const materials = Array.from({ length: 64 }, (_, k) => {
    const conductivity = 10 * Math.exp(2 * normal())
    return {
      name: `Sand ${k}`,
      kx: conductivity,
      ky: conductivity,
      specificStorage: 1e-5,
      specificYield: 0.2,
    }
  })
  const ground: Ground[] = []
  const width = 1000 / 32
  for (let j = 0; j < 32; j++) {
    for (let i = 0; i < 32; i++) {
      const [x, y] = [i * width, j * width]
      const polygon: Position[] = [
        [x, y],
        [x + width, y],
        [x + width, y + width],
        [x, y + width],
      ]
      ground.push({ material: `Sand ${Math.floor(next() * 64)}`, polygon, base: -20, top: 0 })
    }
  }
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 1000], y: [0, 1000] },
    grid: { columns: cells, rows: cells },
    time: { kind: 'steady' },
    materials,
    ground,
    boundaries: [side('West', 3, 12), side('East', 1, 10)],
    recharge: [{ name: 'Rain', rate: 0.001 }],
    wells: Array.from({ length: 20 }, (_, k) => ({
      name: `W${k}`,
      x: 50 + 900 * next(),
      y: 50 + 900 * next(),
      kind: 'abstraction' as const,
      rate: 50,
    })),
    ...changes,
  }
}

export interface EngineTime {
  what: string
  seconds: number
  /** Of these in linear solves, set-up included. */
  linearSeconds: number
  iterations: number
  converged: boolean
  residual: number
  /** Largest resident memory of the process by then, in bytes. */
  memory: number
}

function timed(what: string, model: Model, kernels: Kernels): EngineTime {
  const started = performance.now()
  let linearSeconds = 0
  const { result } = solveModel(model, {
    kernels,
    onLinearSolve: (seconds) => {
      linearSeconds += seconds
    },
  })
  return {
    what,
    seconds: (performance.now() - started) / 1000,
    linearSeconds,
    iterations: result.iterations,
    converged: result.converged,
    residual: result.residual,
    memory: process.resourceUsage().maxRSS * 1024,
  }
}

/** Whole runs through solveModel, model in and results out, by name. `cells` a side. */
export const runs: Record<string, (cells: number, kernels: Kernels) => EngineTime> = {
  steady: (cells, kernels) => timed(`steady, ${cells}^2`, varied(cells, {}), kernels),
  steps: (cells, kernels) =>
    timed(
      `100 steps in time, ${cells}^2`,
      varied(cells, {
        time: {
          kind: 'transient',
          initialHead: 11,
          stages: [{ duration: 100, firstStep: 1, growth: 1, largestStep: 1 }],
        },
      }),
      kernels,
    ),
  unconfined: (cells, kernels) => {
    const { ground } = varied(cells, {})
    const model = varied(cells, {
      flow: 'unconfined',
      ground: ground.map((piece) => ({ ...piece, top: 30 })),
    })
    return timed(`unconfined, ${cells}^2`, model, kernels)
  },
  sor: (cells, kernels) =>
    timed(`steady by over-relaxation, ${cells}^2`, varied(cells, { solver: { method: 'sor' } }), kernels),
}
