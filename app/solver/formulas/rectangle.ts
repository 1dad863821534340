import type { Model } from '~/solver/model'
import {
  evenGround,
  type Formula,
  fillsExtent,
  headOf,
  plainWells,
  potentialOf,
  type Side,
  type Sides,
  sidesOf,
} from './formula'

/**
 * Steady plan flow in a rectangle of even ground whose sides are each held at a head or closed: one-dimensional flow
 * with recharge, a well beside a river, in a strip, in a rectangle. All are exact for the model's own extent: the
 * images of a well in all sides, summed as a series of eigenfunctions along one axis times Green's function along the
 * other. Unconfined flow is the same in the discharge potential.
 */
export function rectangleFormula(model: Model): Formula | null {
  if (model.time.kind !== 'steady' || !fillsExtent(model) || (model.leakage ?? []).length > 0) return null
  const ground = evenGround(model)
  const sides = sidesOf(model)
  const wells = plainWells(model)
  if (!ground || !sides || !wells) return null
  const rate = evenRecharge(model)
  if (rate === null) return null
  const base = baseFlow(model, sides, rate, (head) => potentialOf(ground, head))
  if (!base) return null
  const pumped = wells.filter(({ rates }) => rates[0] !== 0)
  return {
    name: nameOf(sides, pumped.length, rate, ground.confined),
    source: sourceOf(pumped.length, rate, ground.confined),
    extentEffect: 0,
    headAt: (x, y) => {
      const taken = pumped.reduce(
        (sum, well) => sum + (well.rates[0] as number) * greenOf(model, sides, x, y, well.x, well.y),
        0,
      )
      return headOf(ground, base(x, y) - taken)
    },
  }
}

/** The rate of recharge that falls on everything, 0 without any; null where it differs from place to place. */
function evenRecharge(model: Model): number | null {
  let sum = 0
  for (const entry of model.recharge ?? []) {
    if (entry.polygon || typeof entry.rate !== 'number') return null
    sum += entry.rate
  }
  return sum
}

/** The potential without wells: even, or along one axis where only its two sides, or one of them, are held. */
function baseFlow(
  model: Model,
  sides: Sides,
  rate: number,
  potential: (head: number) => number,
): ((x: number, y: number) => number) | null {
  const heldOnes = Object.values(sides).filter((head) => head !== null)
  if (heldOnes.length === 0) return null
  if (rate === 0 && heldOnes.every((head) => head === heldOnes[0])) {
    const level = potential(heldOnes[0] as number)
    return () => level
  }
  for (const [axis, first, second, ...others] of [
    ['x', 'west', 'east', 'south', 'north'],
    ['y', 'south', 'north', 'west', 'east'],
  ] as ['x' | 'y', Side, Side, Side, Side][]) {
    if (others.some((side) => sides[side] !== null)) continue
    const [low, high] = model.extent[axis]
    const length = high - low
    const a = sides[first] === null ? null : potential(sides[first] as number)
    const b = sides[second] === null ? null : potential(sides[second] as number)
    return (x, y) => {
      const s = (axis === 'x' ? x : y) - low
      if (a !== null && b !== null) return a + ((b - a) * s) / length + (rate * s * (length - s)) / 2
      if (a !== null) return a + rate * s * (length - s / 2)
      return (b as number) + (rate * (length * length - s * s)) / 2
    }
  }
  return null
}

/**
 * Green's function of the Laplacian in the extent: the potential that a unit of water taken at (xw, yw) lowers (x, y)
 * by (Carslaw & Jaeger 1959, 14.9 II). The series runs along the axis that makes it short.
 */
function greenOf(model: Model, sides: Sides, x: number, y: number, xw: number, yw: number): number {
  const [x0, x1] = model.extent.x
  const [y0, y1] = model.extent.y
  const a = x1 - x0
  const b = y1 - y0
  const along = (first: Side, second: Side): [boolean, boolean] => [
    sides[first] !== null,
    sides[second] !== null,
  ]
  const overX = Math.abs(y - yw) / a >= Math.abs(x - xw) / b
  return overX
    ? series(a, along('west', 'east'), x - x0, xw - x0, b, along('south', 'north'), y - y0, yw - y0)
    : series(b, along('south', 'north'), y - y0, yw - y0, a, along('west', 'east'), x - x0, xw - x0)
}

const mostTerms = 1_000_000

/** `held`: is the low, the high end of the axis held at a head (otherwise closed)? */
function series(
  a: number,
  heldA: [boolean, boolean],
  s: number,
  sw: number,
  b: number,
  heldB: [boolean, boolean],
  t: number,
  tw: number,
): number {
  const [lowHeld, highHeld] = heldA
  const shift = lowHeld === highHeld ? 0 : 0.5
  const mode = lowHeld ? Math.sin : Math.cos
  const low = Math.min(t, tw)
  const high = Math.max(t, tw)
  const lowSign = heldB[0] ? -1 : 1
  const highSign = heldB[1] ? -1 : 1
  const bothSign = heldB[0] === heldB[1] ? -1 : 1
  let sum = 0
  if (!lowHeld && !highHeld) {
    // The mean over the axis flows along the other one.
    const f = heldB[0] ? low : 1
    const g = heldB[1] ? b - high : 1
    sum += (f * g) / (heldB[0] && heldB[1] ? b : 1) / a
  }
  const [bFar, lowFar, highFar] = [2 * b, 2 * low, 2 * (b - high)]
  for (let n = 1; n < mostTerms; n++) {
    const k = ((n - shift) * Math.PI) / a
    const decay = Math.exp(-k * (high - low))
    const green =
      (decay * (1 + lowSign * Math.exp(-k * lowFar)) * (1 + highSign * Math.exp(-k * highFar))) /
      (2 * k * (1 + bothSign * Math.exp(-k * bFar)))
    sum += (2 / a) * mode(k * s) * mode(k * sw) * green
    if (decay < 1e-15 * n) break
  }
  return sum
}

function nameOf(sides: Sides, wells: number, rate: number, confined: boolean): string {
  const held = Object.values(sides).filter((head) => head !== null).length
  const kind = confined ? 'confined' : 'unconfined (Dupuit)'
  if (wells === 0) return rate === 0 ? `Uniform ${kind} flow` : `One-dimensional ${kind} flow with recharge`
  const beside =
    held === 1 ? 'beside a river' : held === 2 ? 'between two rivers' : `in a rectangle, ${held} sides held`
  return `${wells === 1 ? 'A well' : `${wells} wells`} ${beside}, ${kind}, by images in all sides`
}

function sourceOf(wells: number, rate: number, confined: boolean): string {
  const sources = []
  if (!confined) sources.push('Dupuit (1863), Études théoriques et pratiques sur le mouvement des eaux')
  if (wells > 0) sources.push('Carslaw & Jaeger (1959), Conduction of Heat in Solids; Muskat (1937)')
  if (wells === 0 || rate !== 0) sources.push('Bear (1979), Hydraulics of Groundwater')
  return sources.join('; ')
}
