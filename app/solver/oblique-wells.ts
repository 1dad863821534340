/** Conductivity or transmissivity as the grid's axes see it. */
export interface PlaneTensor {
  xx: number
  xy: number
  yy: number
}

/**
 * ln(equivalent radius / well radius) of a well shared among cells of a nine-point balance (corners.ts) in ground whose
 * principal directions stand oblique to the grid. On an endless even grid the head around a unit source is the potential
 * kernel
 *
 *   a(x) = 1 / 4 pi^2 * integral over the wave numbers of (1 - cos(x . t)) / S(t),
 *
 * S being the balance's symbol, which for long waves is q(t) = t . K t. Far away it is (ln |x| + constant) / 2 pi root(det K),
 * with |x|^2 = x . K^-1 x; the constant, found by taking 1/q out of the integral, is minus the logarithm of the
 * equivalent radius (Peaceman 1983 does the same for five points). Several cells raise their weighted mean by the sum
 * of w_i w_j a(x_i - x_j). A round well of radius r in such ground acts like one of |x| = r (1/root k1 + 1/root k2) / 2.
 *
 * `dx`, `dy`: cell size; places of the shares in columns and rows.
 */
export function obliqueLogRadii(
  shares: { column: number; row: number; weight: number }[],
  dx: number,
  dy: number,
  k: PlaneTensor,
  radius: number,
): number {
  const det = k.xx * k.yy - k.xy * k.xy
  const scaled = { xx: (k.xx * dy) / dx, xy: k.xy, yy: (k.yy * dx) / dy }
  const apart = pairsOf(shares)
  let regular = 0
  let raised = 0
  // Half the plane of wave numbers: the other half is the same.
  for (let sector = 0; sector < sectors; sector++) {
    for (const turn of gauss) {
      const angle = ((sector + turn.at) * Math.PI) / sectors
      const [cosine, sine] = [Math.cos(angle), Math.sin(angle)]
      const reach = Math.PI / Math.max(Math.abs(cosine), Math.abs(sine))
      const q = scaled.xx * cosine * cosine + 2 * scaled.xy * cosine * sine + scaled.yy * sine * sine
      let along = Math.log(reach * Math.sqrt(q)) / q
      let pairs = 0
      for (const step of gauss) {
        const t = step.at * reach
        const s = symbolOf(scaled, det, t * cosine, t * sine)
        along += step.weight * reach * (t / s - 1 / (q * t))
        for (const { columns, rows, weight } of apart) {
          const phase = t * (cosine * columns + sine * rows)
          pairs += (step.weight * reach * t * weight * (1 - Math.cos(phase))) / s
        }
      }
      const weight = (2 * turn.weight * Math.PI) / sectors
      regular += weight * along
      raised += weight * pairs
    }
  }
  const euler = 0.5772156649015329
  const root = Math.sqrt(det)
  const equivalent =
    Math.log(2) - euler + (root / (2 * Math.PI)) * (raised - regular) + 0.5 * Math.log(dx * dy)
  const k1 = (k.xx + k.yy) / 2 + Math.hypot((k.xx - k.yy) / 2, k.xy)
  const k2 = det / k1
  return equivalent - Math.log((radius * (1 / Math.sqrt(k1) + 1 / Math.sqrt(k2))) / 2)
}

interface Pair {
  columns: number
  rows: number
  weight: number
}

/** The sum of w_i w_j over all pairs of shares that lie so many columns and rows apart. */
function pairsOf(shares: { column: number; row: number; weight: number }[]): Pair[] {
  const pairs = new Map<string, Pair>()
  for (const [index, a] of shares.entries()) {
    for (const b of shares.slice(index + 1)) {
      const sign = b.column > a.column || (b.column === a.column && b.row > a.row) ? 1 : -1
      const [columns, rows] = [sign * (b.column - a.column), sign * (b.row - a.row)]
      const key = `${columns} ${rows}`
      const pair = pairs.get(key) ?? { columns, rows, weight: 0 }
      pair.weight += 2 * a.weight * b.weight
      pairs.set(key, pair)
    }
  }
  return [...pairs.values()]
}

/** What the balance of an even grid makes of a wave of the given numbers a cell: links times 2 (1 - cos). */
function symbolOf({ xx, xy, yy }: PlaneTensor, det: number, t1: number, t2: number): number {
  const [s1, c1] = [Math.sin(t1 / 2), Math.cos(t1 / 2)]
  const [s2, c2] = [Math.sin(t2 / 2), Math.cos(t2 / 2)]
  const [acrossX, acrossY] = [s1 * c2, s2 * c1]
  // A chequerboard only meets the conductivity that no flow across leaves: det / Kyy and det / Kxx.
  const board = 4 * s1 * s1 * s2 * s2 * (det / yy + det / xx)
  return 4 * xx * acrossX * acrossX + 8 * xy * acrossX * acrossY + 4 * yy * acrossY * acrossY + board
}

const sectors = 24

/** Points and weights of Gauss and Legendre on 0..1, exact for polynomials of degree 31. */
const gauss = gaussPoints(16)

function gaussPoints(n: number): { at: number; weight: number }[] {
  return Array.from({ length: n }, (_, k) => {
    let x = Math.cos((Math.PI * (k + 0.75)) / (n + 0.5))
    let slope = 1
    for (let step = 0; step < 50; step++) {
      let [before, value] = [1, x]
      for (let m = 2; m <= n; m++) {
        const next = ((2 * m - 1) * x * value - (m - 1) * before) / m
        before = value
        value = next
      }
      slope = (n * (x * value - before)) / (x * x - 1)
      const change = value / slope
      x -= change
      if (Math.abs(change) < 1e-16) break
    }
    return { at: (1 + x) / 2, weight: 1 / ((1 - x * x) * slope * slope) }
  })
}
