import type { Model } from '~/solver/model'
import {
  type EvenGround,
  evenGround,
  type Formula,
  fillsExtent,
  type PlainWell,
  plainWells,
  sidesOf,
} from './formula'
import { besselK0, leakyWellFunction, wellFunction } from './special-functions'

/** The share of the greatest drawdown compared that the extent may be worth. */
const negligible = 0.01

/**
 * Wells in endless confined ground: leaky ground in steady flow (de Glee 1930; Jacob 1946), and the growth of the cone
 * without leakage (Theis 1935) and with it (Hantush & Jacob 1955), rates that change from stage to stage superposed.
 * Only where the sides lie so far off that the formula's own drawdown on them hardly counts.
 */
export function endlessFormula(model: Model): Formula | null {
  if (!fillsExtent(model) || (model.recharge ?? []).length > 0) return null
  const ground = evenGround(model)
  const sides = sidesOf(model)
  const wells = plainWells(model)
  if (!ground?.confined || !sides || !wells || wells.length === 0) return null
  const leak = leakOf(model)
  if (leak === 'differs') return null
  const rest = restHead(model, leak, Object.values(sides))
  if (rest === null) return null
  const transmissivity = ground.k * (ground.top - ground.base)
  const length = leak ? Math.sqrt(transmissivity / leak.leakance) : Number.POSITIVE_INFINITY
  const drawdown =
    model.time.kind === 'steady'
      ? steadyDrawdown(wells, transmissivity, length)
      : growingDrawdown(model, ground, wells, transmissivity, length)
  if (!drawdown) return null
  const end =
    model.time.kind === 'steady' ? 0 : model.time.stages.reduce((sum, stage) => sum + stage.duration, 0)
  const extentEffect = onSides(model, (x, y) => drawdown(x, y, end))
  const greatest = Math.max(
    ...wells.map((well) => Math.abs(drawdown(well.x + nearest(model), well.y, end))),
    0,
  )
  if (!(extentEffect <= negligible * greatest)) return null
  return {
    name: `${wells.length === 1 ? 'A well' : `${wells.length} wells`} in endless ${leak ? 'leaky' : 'confined'} ground`,
    source: leak
      ? model.time.kind === 'steady'
        ? 'de Glee (1930); Jacob (1946), Trans. AGU 27, 198'
        : 'Hantush & Jacob (1955), Trans. AGU 36, 95'
      : 'Theis (1935), Trans. AGU 16, 519',
    extentEffect,
    headAt: (x, y, time) => rest - drawdown(x, y, time),
  }
}

interface Leak {
  head: number
  leakance: number
}

function leakOf(model: Model): Leak | null | 'differs' {
  const [entry, ...more] = model.leakage ?? []
  if (!entry) return null
  if (more.length > 0 || entry.polygon || typeof entry.head !== 'number' || !(entry.leakance > 0))
    return 'differs'
  return { head: entry.head, leakance: entry.leakance }
}

/** The level everything rests at before the wells start; null where there is no single one. */
function restHead(model: Model, leak: Leak | null, sides: (number | null)[]): number | null {
  const levels = sides.filter((head) => head !== null)
  if (leak) levels.push(leak.head)
  if (model.time.kind === 'transient') {
    if (typeof model.time.initialHead === 'number') levels.push(model.time.initialHead)
    else if (model.time.initialHead !== 'steady') return null
  }
  const [first, ...others] = levels
  if (
    first === undefined ||
    others.some((level) => Math.abs(level - first) > 1e-9 * Math.max(1, Math.abs(first)))
  ) {
    return null
  }
  return first
}

type Drawdown = (x: number, y: number, time: number) => number

function steadyDrawdown(wells: PlainWell[], transmissivity: number, length: number): Drawdown | null {
  if (length === Number.POSITIVE_INFINITY) return null
  return (x, y) =>
    wells.reduce((sum, well) => {
      const r = Math.hypot(x - well.x, y - well.y)
      return sum + ((well.rates[0] as number) / (2 * Math.PI * transmissivity)) * besselK0(r / length)
    }, 0)
}

function growingDrawdown(
  model: Model,
  ground: EvenGround,
  wells: PlainWell[],
  transmissivity: number,
  length: number,
): Drawdown | null {
  if (model.time.kind !== 'transient' || !ground.specificStorage) return null
  const storage = ground.specificStorage * (ground.top - ground.base)
  const starts = [0]
  for (const stage of model.time.stages) starts.push((starts.at(-1) as number) + stage.duration)
  return (x, y, time) => {
    let sum = 0
    for (const well of wells) {
      const r = Math.hypot(x - well.x, y - well.y)
      const rateIn = (stage: number) => well.rates[well.rates.length === 1 ? 0 : stage] as number
      for (let stage = 0; stage + 1 < starts.length; stage++) {
        const since = time - (starts[stage] as number)
        const change = rateIn(stage) - (stage > 0 ? rateIn(stage - 1) : 0)
        if (since <= 0 || change === 0) continue
        const u = (r * r * storage) / (4 * transmissivity * since)
        const w = length === Number.POSITIVE_INFINITY ? wellFunction(u) : leakyWellFunction(u, r / length)
        sum += (change / (4 * Math.PI * transmissivity)) * w
      }
    }
    return sum
  }
}

/** A place beside a well to judge drawdowns by: a hundredth of the shorter side away. */
function nearest({ extent: { x, y } }: Model): number {
  return Math.min(x[1] - x[0], y[1] - y[0]) / 100
}

/** The greatest drawdown along the sides, doubled as a closed side doubles it. */
function onSides({ extent: { x, y } }: Model, drawdown: (x: number, y: number) => number): number {
  let greatest = 0
  for (let k = 0; k <= 40; k++) {
    const px = x[0] + ((x[1] - x[0]) * k) / 40
    const py = y[0] + ((y[1] - y[0]) * k) / 40
    for (const [qx, qy] of [
      [px, y[0]],
      [px, y[1]],
      [x[0], py],
      [x[1], py],
    ] as [number, number][]) {
      greatest = Math.max(greatest, Math.abs(drawdown(qx, qy)))
    }
  }
  return 2 * greatest
}
