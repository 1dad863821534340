import { expect } from 'vitest'
import { solverKernels } from '~/heads/kernels.server'
import type { Boundary, Model, Position, Stage, Well } from '~/solver/model'
import { defaultTolerance, type Solution, solveModel } from '~/solver/solve'
import published from './published.json'

interface Check<Inputs, Expected> {
  title: string
  source: string
  inputs: Inputs
  expected: Expected
}

/** One entry of the published checks. The caller names the fields it reads. */
export function check<Inputs, Expected>(id: string): Check<Inputs, Expected> {
  const found = published.find((entry) => entry.id === id)
  if (!found) throw new Error(`no published check ${id}`)
  return found as unknown as Check<Inputs, Expected>
}

export type Rest = Partial<Model> & Pick<Model, 'extent' | 'grid' | 'materials' | 'ground'>

/** A plan model in metres and seconds, steady and confined unless `rest` says otherwise. */
export function plan(rest: Rest): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 's' },
    kind: 'plan',
    flow: 'confined',
    time: { kind: 'steady' },
    ...rest,
  }
}

function solvedBy(method: 'sor' | 'multigrid', model: Model): Solution {
  const solution = solveModel({ ...model, solver: { ...model.solver, method } }, { kernels: solverKernels() })
  const { result } = solution
  expect(result.method).toBe(method)
  expect(result.converged).toBe(true)
  for (const percent of result.balance.errorPercent) expect(Math.abs(percent)).toBeLessThan(1e-4)
  return solution
}

/** One method's solution; it has converged and its balance closes at every reported time. */
export function solved(rest: Rest, method: 'sor' | 'multigrid' = 'multigrid'): Solution {
  return solvedBy(method, plan(rest))
}

/**
 * Solves by both methods, which must agree in every head to ten times the tolerance, relative to the range of heads,
 * at the end and at every reported time. Returns the fast method's solution.
 */
export function solvedByBoth(rest: Rest): Solution {
  const model = plan(rest)
  const relaxed = solvedBy('sor', model)
  const fast = solvedBy('multigrid', model)
  const allowed = 10 * (model.solver?.tolerance ?? defaultTolerance)
  expect(differenceOverRange(relaxed.heads, fast.heads)).toBeLessThan(allowed)
  relaxed.fields.forEach(({ heads }, k) => {
    expect(differenceOverRange(heads, fast.fields[k]?.heads as Float64Array)).toBeLessThan(allowed)
  })
  return fast
}

/** Largest difference of two fields of heads over the range of the first. */
export function differenceOverRange(one: Float64Array, other: Float64Array): number {
  let [lowest, highest, largest] = [Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY, 0]
  one.forEach((head, cell) => {
    if (Number.isNaN(head)) return
    lowest = Math.min(lowest, head)
    highest = Math.max(highest, head)
    largest = Math.max(largest, Math.abs(head - (other[cell] as number)))
  })
  return largest === 0 ? 0 : largest / (highest - lowest)
}

/** Head at a named point, at the `at`-th reported time. */
export function head({ result }: Solution, name: string, at = 0): number {
  const found = result.points.find((point) => point.name === name)?.head[at]
  if (typeof found !== 'number') throw new Error(`no head at ${name}`)
  return found
}

/** Head at the face of the first well. */
export function faceHead({ result }: Solution, at = 0): number {
  const found = result.wells[0]?.wellHead[at]
  if (typeof found !== 'number') throw new Error('no head at the well face')
  return found
}

/** Net inflow through a named boundary. */
export function intoModel({ result }: Solution, name: string, at = 0): number {
  const found = result.boundaries.find((boundary) => boundary.name === name)
  return (found?.inflow[at] ?? Number.NaN) - (found?.outflow[at] ?? Number.NaN)
}

/** Ground of transmissivity T and storage coefficient S: one metre thick, far below the heads. */
export function sheet(transmissivity: number, storage?: number) {
  return {
    materials: [
      {
        name: 'Ground',
        kx: transmissivity,
        ky: transmissivity,
        ...(storage === undefined ? {} : { specificStorage: storage }),
      },
    ],
    ground: [{ material: 'Ground', base: -1001, top: -1000 }],
  }
}

export function fixed(name: string, line: Position[], level: number | number[]): Boundary {
  return { name, kind: 'fixed head', line, head: level }
}

export function abstraction(x: number, y: number, rate: Well['rate'], radius?: number): Well {
  return { name: 'Well', x, y, kind: 'abstraction', rate, ...(radius === undefined ? {} : { radius }) }
}

/** A line from one place to another, for values that change along it. */
export function between(from: Position, to: Position, pieces = 1): Position[] {
  return Array.from(
    { length: pieces + 1 },
    (_, k): Position => [
      from[0] + ((to[0] - from[0]) * k) / pieces,
      from[1] + ((to[1] - from[1]) * k) / pieces,
    ],
  )
}

type Extent = Model['extent']

export function sideLine(
  which: 'west' | 'east' | 'south' | 'north',
  { x, y }: Extent,
  pieces = 1,
): Position[] {
  const [w, e] = x
  const [s, n] = y
  if (which === 'west') return between([w, s], [w, n], pieces)
  if (which === 'east') return between([e, s], [e, n], pieces)
  if (which === 'south') return between([w, s], [e, s], pieces)
  return between([w, n], [e, n], pieces)
}

/** All four sides held at the head that a formula gives along them. */
export function heldAllRound(extent: Extent, level: (place: Position) => number): Boundary[] {
  return (['west', 'east', 'south', 'north'] as const).map((which) => {
    const line = sideLine(which, extent, 400)
    return fixed(which, line, line.map(level))
  })
}

export function rectangle(x0: number, x1: number, y0: number, y1: number): Position[] {
  return between([x0, y0], [x1, y0]).concat(between([x1, y1], [x0, y1]))
}

export function circle(radius: number, corners = 720): Position[] {
  return Array.from({ length: corners }, (_, k): Position => {
    const angle = ((k + 0.5) * 2 * Math.PI) / corners
    return [radius * Math.cos(angle), radius * Math.sin(angle)]
  })
}

export function closed(polygon: Position[]): Position[] {
  return [...polygon, polygon[0] as Position]
}

/** Edges from 0 outwards: `even` cells of `size`, then each `growth` times the one before, as far as `reach`. */
export function growing(size: number, even: number, growth: number, reach: number): number[] {
  const edges = Array.from({ length: even + 1 }, (_, k) => k * size)
  let step = size
  while ((edges[edges.length - 1] as number) < reach) {
    step *= growth
    edges.push((edges[edges.length - 1] as number) + step)
  }
  return edges
}

/** The edges and their mirror images about 0. */
export function bothWays(edges: number[]): number[] {
  const mirrored = edges
    .filter((edge) => edge > 0)
    .reverse()
    .map((edge) => -edge)
  return [...mirrored, ...edges]
}

/** The same cells on both sides of one in the middle, whose centre is 0. */
export function aroundACell(size: number, even: number, growth: number, reach: number): number[] {
  return bothWays(
    growing(size, even, growth, reach)
      .slice(1)
      .map((edge) => edge - size / 2),
  )
}

export function extentOf(xEdges: number[], yEdges: number[]): Extent {
  return {
    x: [xEdges[0] as number, xEdges[xEdges.length - 1] as number],
    y: [yEdges[0] as number, yEdges[yEdges.length - 1] as number],
  }
}

/**
 * Stages that end at the given times, the steps growing by `growth` from `firstStep` as if there were but one stage.
 * At `fresh` times they start small again.
 */
export function stagesTo(times: number[], firstStep: number, growth: number, fresh: number[] = []): Stage[] {
  let start = 0
  let origin = 0
  return times.map((end) => {
    if (fresh.includes(start)) origin = start
    const stage = {
      duration: end - start,
      firstStep: Math.min(end - start, firstStep + (growth - 1) * (start - origin)),
      growth,
    }
    start = end
    return stage
  })
}

export function relative(value: number, reference: number): number {
  return Math.abs(value - reference) / Math.abs(reference)
}
