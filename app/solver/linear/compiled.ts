import { conjugateGradients } from './conjugate-gradients'
import { cycleOf, type Part } from './cycle'
import { type KernelExports, type Kernels, mostPages } from './kernels'
import { doubleArrays, type Grid, nineArrays, type Plan, planCoarser, planFinest, planInverse } from './plan'
import type { LinearOptions, LinearOutcome, LinearSystem, Prepared } from './system'
import { Alone, asked, countersOf, decideTogether, isTaken, mayAsk, meetings, offerTurn } from './team'

/** A grid of at most so many cells is solved directly. */
const coarsest = 64
/** Links along rows stronger than those across by this factor (geometric mean): leave out only columns. */
const leaning = 3
/** Fewer cells are not worth a second thread's while. */
const worthTwoThreads = 20_000

/** Geometric mean of how much stronger one direction's links are than the other's, of a sample of the cells. */
function lean(cells: number, along: (c: number) => number, across: (c: number) => number): number {
  let sum = 0
  let count = 0
  const step = Math.max(1, Math.floor(cells / 499))
  for (let c = 0; c < cells; c += step) {
    const one = along(c)
    const other = across(c)
    if (one > 0 && other > 0) {
      sum += Math.log(one / other)
      count++
    }
  }
  return count > 0 ? Math.exp(sum / count) : 1
}

function leanOf({ columns, rows, east, north }: LinearSystem): number {
  return lean(
    columns * rows,
    (c) => east[c] as number,
    (c) => north[c] as number,
  )
}

function transposed(values: Float64Array, columns: number, rows: number): Float64Array {
  const out = new Float64Array(values.length)
  for (let first = 0; first < rows; first += 32) {
    for (let i = 0; i < columns; i++) {
      for (let j = first; j < Math.min(rows, first + 32); j++) {
        out[i * rows + j] = values[j * columns + i] as number
      }
    }
  }
  return out
}

/**
 * Makes a five-point system ready for the compiled kernels. Where links across rows are much the stronger ones rows
 * and columns change places, so that only one direction needs kernels of its own. `before`, if any, gives its memory
 * and must not be used any more.
 */
export function prepareCompiled(system: LinearSystem, kernels: Kernels, before?: Prepared): Prepared {
  const { columns, rows } = system
  const turned = rows > 1 && (columns === 1 || leanOf(system) < 1 / leaning)
  if (!turned) return prepareRows(system, kernels, before)
  const inner = prepareRows(
    {
      columns: rows,
      rows: columns,
      east: transposed(system.north, columns, rows),
      north: transposed(system.east, columns, rows),
      northEast: null,
      northWest: null,
      own: transposed(system.own, columns, rows),
    },
    kernels,
    before,
  )
  const prepared: Prepared = {
    bytes: inner.bytes,
    solve(b, x, options) {
      const solution = transposed(x, columns, rows)
      const outcome = inner.solve(transposed(b, columns, rows), solution, options)
      x.set(transposed(solution, rows, columns))
      return outcome
    },
    precondition(r, z) {
      const made = new Float64Array(z.length)
      inner.precondition(transposed(r, columns, rows), made)
      z.set(transposed(made, rows, columns))
    },
  }
  const machine = machines.get(inner)
  if (machine) machines.set(prepared, machine)
  return prepared
}

/** Memory that grows, its views and the kernels that work in it. */
interface Machine {
  memory: WebAssembly.Memory
  kernels: KernelExports
  floats: Float32Array
  doubles: Float64Array
  grow: (bytes: number) => void
  /** What lies in the memory; null: zeros. */
  plan: Plan | null
  shared: boolean
}

/** `shared`: memory that another thread can work in too. */
export function machineOf(kernels: Kernels, shared: boolean): Machine {
  const memory = new WebAssembly.Memory({ initial: 1, maximum: mostPages, shared })
  const module = shared ? kernels.shared : kernels.module
  const instance = new WebAssembly.Instance(module, { env: { memory } })
  const machine: Machine = {
    memory,
    kernels: instance.exports as unknown as KernelExports,
    floats: new Float32Array(memory.buffer),
    doubles: new Float64Array(memory.buffer),
    plan: null,
    shared,
    grow(bytes) {
      const missing = Math.ceil((bytes + 64 - memory.buffer.byteLength) / 65536)
      if (missing <= 0) return
      memory.grow(missing)
      machine.floats = new Float32Array(memory.buffer)
      machine.doubles = new Float64Array(memory.buffer)
    },
  }
  return machine
}

/** Can a system's numbers take the places of an earlier one's? The zeros of the rims are then there already. */
function fits(machine: Machine, columns: number, rows: number, along: boolean): Plan | null {
  const { plan } = machine
  if (plan && plan.columns === columns && plan.rows === rows && plan.way.along === along) return plan
  if (plan) machine.floats.fill(0)
  machine.plan = null
  return null
}

/** Lays the system out and makes all coarser grids. */
export function setUp(system: LinearSystem, machine: Machine): Plan {
  const { columns, rows } = system
  const { kernels: k } = machine
  const along = rows === 1 || (columns > 2 && leanOf(system) > leaning)
  const kept = fits(machine, columns, rows, along)
  const plan = kept ?? planFinest(columns, rows, along)
  machine.grow(plan.bytes)
  const { single, double, size, stride, staged, stage, way } = plan
  plan.gaps = 0
  for (let from = 0; from < rows; from += staged) {
    const to = Math.min(rows, from + staged)
    const north = stage + 8 * columns * staged
    const own = north + 8 * columns * (staged + 1)
    machine.doubles.set(system.east.subarray(from * columns, to * columns), stage / 8)
    machine.doubles.set(system.own.subarray(from * columns, to * columns), own / 8)
    // With the row below; there is none below the first.
    const below = Math.max(0, from - 1)
    const place = north / 8 + (from > 0 ? 0 : columns)
    machine.doubles.set(system.north.subarray(below * columns, to * columns), place)
    plan.gaps |= k.load5(single, size, stride, double, columns, rows, stage, north, own, from, to)
  }
  const first = plan.grids[0] as Grid
  const toFirst = [way.shares, way.sharesSize, first.at, first.size, first.stride, first.half] as const
  if (along) {
    k.galerkinRedAlong(size, stride, double, columns, ...toFirst, 0, first.rows)
  } else {
    k.sharesRedBoth(size, stride, double, columns, rows, way.shares, way.sharesSize, 0, first.rows)
    k.galerkinRedBoth(size, stride, double, columns, ...toFirst, 0, first.rows)
  }
  k.invert(first.at, first.size, first.stride, first.half, 0, first.rows)
  let last = first
  for (let n = 1; last.columns * last.rows > coarsest; n++) last = coarsened(plan, n, machine)
  if (plan.inverse === 0) planInverse(plan)
  machine.grow(plan.bytes)
  const { inverse, width, work, wide } = plan
  k.invertCoarsest(
    last.at,
    last.size,
    last.stride,
    last.half,
    last.columns,
    last.rows,
    inverse,
    width,
    work,
    wide,
  )
  machine.plan = plan
  return plan
}

/** Number of a grid's array at its cell c. */
export function numberAt(grid: Grid, machine: Machine, array: number, c: number): number {
  const i = c % grid.columns
  const row = grid.at + array * grid.size + (Math.floor(c / grid.columns) + 1) * grid.stride + 16
  return machine.floats[(row + (i & 1) * grid.half) / 4 + (i >> 1)] as number
}

/** Fills grid n from grid n - 1, in the place that the plan has for it if it is to be coarsened the same way again. */
function coarsened(plan: Plan, n: number, machine: Machine): Grid {
  const { kernels: k } = machine
  const fine = plan.grids[n - 1] as Grid
  function strength(c: number, array: number): number {
    const corners =
      numberAt(fine, machine, nineArrays.northEast, c) + numberAt(fine, machine, nineArrays.northWest, c)
    return numberAt(fine, machine, array, c) + corners
  }
  const ratio = lean(
    fine.columns * fine.rows,
    (c) => strength(c, nineArrays.east),
    (c) => strength(c, nineArrays.north),
  )
  const wanted = fine.rows === 1 || (ratio > leaning && fine.columns > 2)
  if (plan.grids[n] && fine.way.along !== wanted) {
    plan.grids.length = n
    plan.inverse = 0
  }
  const coarse = plan.grids[n] ?? planCoarser(plan, wanted)
  machine.grow(plan.bytes)
  const { along, shares, sharesSize, middles, middleRow } = fine.way
  const from = [
    fine.at,
    fine.size,
    fine.stride,
    fine.half,
    fine.columns,
    fine.rows,
    shares,
    sharesSize,
  ] as const
  const to = [coarse.at, coarse.size, coarse.stride, coarse.half] as const
  k.sharesOf(...from, along ? 1 : 0, 0, coarse.rows)
  if (along) k.galerkinAlong(...from, ...to, 0, coarse.rows)
  else k.galerkinBoth(...from, ...to, middles, middleRow, 0, coarse.rows)
  k.invert(...to, 0, coarse.rows)
  return coarse
}

/** Whose memory a system lies in, so that a later one can take it over. */
const machines = new WeakMap<Prepared, Machine>()

function prepareRows(system: LinearSystem, kernels: Kernels, before: Prepared | undefined): Prepared {
  const { columns, rows } = system
  const { second } = columns * rows >= worthTwoThreads ? kernels : { second: undefined }
  let machine = (before && machines.get(before)) ?? machineOf(kernels, second !== undefined)
  if (before) machines.delete(before)
  const plan = setUp(system, machine)
  const { single, double, size, stride, stage, staged } = plan
  const { blackOwn, p, q, redX } = doubleArrays
  const onItsOwn: Part = { index: 0, count: 1, meet: () => {} }
  let { kernels: k, doubles } = machine
  let cycle = cycleOf(plan, k, doubles, onItsOwn)
  let turn = 0

  /** Gives up a memory that another thread may still write to. */
  function leaveMemory(): void {
    const own = machineOf(kernels, false)
    own.grow(plan.bytes)
    own.doubles.set(doubles.subarray(0, Math.ceil(plan.bytes / 8)))
    own.plan = plan
    machine = own
    k = own.kernels
    doubles = own.doubles
    cycle = cycleOf(plan, k, doubles, onItsOwn)
    machines.set(prepared, own)
  }

  /** Lays numbers in the order of the cells out by colours, in the places of two arrays. */
  function layOut(values: Float64Array, red: number, black: number): void {
    for (let from = 0; from < rows; from += staged) {
      const to = Math.min(rows, from + staged)
      doubles.set(values.subarray(from * columns, to * columns), stage / 8)
      k.parted(size, stride, double, columns, stage, red, black, from, to)
    }
  }

  /** The other way; cells without an equation keep what they have. */
  function bringBack(values: Float64Array, red: number): void {
    for (let from = 0; from < rows; from += staged) {
      const to = Math.min(rows, from + staged)
      const part = values.subarray(from * columns, to * columns)
      if (plan.gaps === 0) {
        k.joined(size, stride, double, columns, stage, red, blackOwn, from, to)
      } else {
        doubles.set(part, stage / 8)
        k.joinedWithGaps(single, size, stride, double, columns, stage, red, blackOwn, from, to)
      }
      part.set(doubles.subarray(stage / 8, stage / 8 + part.length))
    }
  }

  function solve(b: Float64Array, x: Float64Array, options: LinearOptions): LinearOutcome {
    if (isZero(b)) x.fill(0)
    const outcome = solveTogether(b, x, options) ?? solveAlone(b, x, options)
    bringBack(x, redX)
    return outcome
  }

  function solveAlone(b: Float64Array, x: Float64Array, options: LinearOptions): LinearOutcome {
    layOut(x, redX, blackOwn)
    return conjugateGradients(cycle, options, {
      layOut: () => layOut(b, q, blackOwn),
      largest: () => k.largest(size, stride, double, p, 0, rows),
      decide: (iterations, norm) => (options.watch?.(iterations, norm) ? 'cancel' : 'go on'),
      alone: () => cycle,
    })
  }

  /** With the second thread; null when it does not come, or is lost on the way. */
  function solveTogether(b: Float64Array, x: Float64Array, options: LinearOptions): LinearOutcome | null {
    if (!second || !machine.shared || !mayAsk(second)) return null
    const counters = countersOf(machine.memory, plan)
    turn++
    if (!offerTurn(counters, turn)) return null
    const { target, mostIterations } = options
    second.post({ module: kernels.shared, memory: machine.memory, plan, target, mostIterations, turn })
    layOut(x, redX, blackOwn)
    if (!isTaken(counters, turn)) {
      asked(second, false)
      return null
    }
    const started = performance.now()
    const meeting = meetings(counters, 0)
    const part: Part = { index: 0, count: 2, meet: meeting.meet }
    let parted = false
    try {
      const outcome = conjugateGradients(cycleOf(plan, k, doubles, part), options, {
        layOut() {
          layOut(b, q, blackOwn)
          if (!parted) meeting.meet()
        },
        largest: () => k.largest(size, stride, double, p, 0, rows),
        decide(iterations, norm) {
          const wanted = options.watch?.(iterations, norm) ? 'cancel' : 'go on'
          if (parted) return wanted
          // On a machine that is busy otherwise, threads wait for one another most of the time.
          const slow = meeting.waited > 0.25 * (performance.now() - started)
          parted = slow && wanted === 'go on'
          return decideTogether(counters, meeting, parted ? 'part' : wanted)
        },
        alone: () => cycle,
      })
      asked(second, !parted)
      return outcome
    } catch (error) {
      if (!(error instanceof Alone)) throw error
      leaveMemory()
      asked(second, false)
      return null
    }
  }

  function precondition(r: Float64Array, z: Float64Array): void {
    const most = largestOf(r)
    z.fill(0)
    if (most === 0) return
    // Single precision has no room for numbers far from 1.
    const scaled = r.map((value) => value / most)
    layOut(z, redX, blackOwn)
    layOut(scaled, q, blackOwn)
    cycle.trueResidual(1)
    cycle.descend()
    cycle.up()
    cycle.product(0)
    layOut(scaled, q, blackOwn)
    cycle.eliminate(p)
    bringBack(z, p)
    for (let c = 0; c < z.length; c++) z[c] = (z[c] as number) * most
  }

  const prepared: Prepared = { solve, precondition, bytes: plan.bytes }
  machines.set(prepared, machine)
  return prepared
}

function isZero(values: Float64Array): boolean {
  for (let c = 0; c < values.length; c++) if (values[c] !== 0) return false
  return true
}

function largestOf(values: Float64Array): number {
  let most = 0
  for (let c = 0; c < values.length; c++) most = Math.max(most, Math.abs(values[c] as number))
  return most
}
