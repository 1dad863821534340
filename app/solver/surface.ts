import { ModelError, requireFinite } from './model-error'

type Corner = [x: number, y: number, z: number]

/**
 * A level through scattered points: linear on the Delaunay triangles (Bowyer 1981 and Watson 1981, insertion point by
 * point), so it meets every point and reproduces a plane; beyond the outermost points the level of the nearest place
 * on their outline. One point gives a constant, points in a row the linear level along them.
 */
export function surfaceThrough(points: Corner[], path: string): (x: number, y: number) => number {
  if (points.length === 0) throw new ModelError(path, 'there is no point')
  points.forEach((point, index) => {
    for (let k = 0; k < 3; k++) requireFinite(point[k], `${path}[${index}][${k}]`)
  })
  points.forEach((point, index) => {
    if (points.findIndex((other) => other[0] === point[0] && other[1] === point[1]) !== index) {
      throw new ModelError(`${path}[${index}]`, 'there is another level at the same place')
    }
  })
  const triangles = triangulated(points)
  const outline = triangles.length > 0 ? outlineOf(triangles) : chainOf(points)
  return (x, y) => {
    for (const [a, b, c] of triangles) {
      const weights = barycentric(points[a] as Corner, points[b] as Corner, points[c] as Corner, x, y)
      if (weights) {
        return (
          weights[0] * (points[a] as Corner)[2] +
          weights[1] * (points[b] as Corner)[2] +
          weights[2] * (points[c] as Corner)[2]
        )
      }
    }
    return nearestOn(points, outline, x, y)
  }
}

function barycentric(a: Corner, b: Corner, c: Corner, x: number, y: number): [number, number, number] | null {
  const area = (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
  const u = ((b[0] - x) * (c[1] - y) - (b[1] - y) * (c[0] - x)) / area
  const v = ((c[0] - x) * (a[1] - y) - (c[1] - y) * (a[0] - x)) / area
  const w = 1 - u - v
  return u >= -1e-12 && v >= -1e-12 && w >= -1e-12 ? [u, v, w] : null
}

function triangulated(points: Corner[]): [number, number, number][] {
  const xs = points.map((point) => point[0])
  const ys = points.map((point) => point[1])
  const middle: [number, number] = [
    (Math.min(...xs) + Math.max(...xs)) / 2,
    (Math.min(...ys) + Math.max(...ys)) / 2,
  ]
  const span = Math.max(Math.max(...xs) - Math.min(...xs), Math.max(...ys) - Math.min(...ys)) || 1
  const n = points.length
  // A triangle far around all points; its corners and everything that hangs on them are dropped at the end.
  const reach = 1e5 * span
  const all: Corner[] = [
    ...points,
    [middle[0] - reach, middle[1] - reach, 0],
    [middle[0] + reach, middle[1] - reach, 0],
    [middle[0], middle[1] + reach, 0],
  ]
  let triangles: [number, number, number][] = [[n, n + 1, n + 2]]
  for (let p = 0; p < n; p++) {
    const [x, y] = all[p] as Corner
    const edges = new Map<string, [number, number]>()
    triangles = triangles.filter((triangle) => {
      if (!inCircle(all, triangle, x, y)) return true
      for (let k = 0; k < 3; k++) {
        const a = triangle[k] as number
        const b = triangle[(k + 1) % 3] as number
        if (edges.has(`${b} ${a}`)) edges.delete(`${b} ${a}`)
        else edges.set(`${a} ${b}`, [a, b])
      }
      return false
    })
    for (const [a, b] of edges.values()) triangles.push([a, b, p])
  }
  return triangles.filter((triangle) => {
    if (triangle.some((corner) => corner >= n)) return false
    const [a, b, c] = triangle.map((corner) => all[corner] as Corner) as [Corner, Corner, Corner]
    const area = (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
    return Math.abs(area) > 1e-12 * span * span
  })
}

function inCircle(points: Corner[], [i, j, k]: [number, number, number], x: number, y: number): boolean {
  const [ax, ay] = [(points[i] as Corner)[0] - x, (points[i] as Corner)[1] - y]
  const [bx, by] = [(points[j] as Corner)[0] - x, (points[j] as Corner)[1] - y]
  const [cx, cy] = [(points[k] as Corner)[0] - x, (points[k] as Corner)[1] - y]
  const determinant =
    (ax * ax + ay * ay) * (bx * cy - cx * by) -
    (bx * bx + by * by) * (ax * cy - cx * ay) +
    (cx * cx + cy * cy) * (ax * by - bx * ay)
  const area = (bx - ax) * (cy - ay) - (by - ay) * (cx - ax)
  return area > 0 ? determinant > 0 : determinant < 0
}

function outlineOf(triangles: [number, number, number][]): [number, number][] {
  const edges = new Map<string, [number, number]>()
  for (const triangle of triangles) {
    for (let k = 0; k < 3; k++) {
      const a = triangle[k] as number
      const b = triangle[(k + 1) % 3] as number
      const key = a < b ? `${a} ${b}` : `${b} ${a}`
      if (edges.has(key)) edges.delete(key)
      else edges.set(key, [a, b])
    }
  }
  return [...edges.values()]
}

/** One point, or points in a row: the pieces between them in order. */
function chainOf(points: Corner[]): [number, number][] {
  const order = points.map((_, index) => index)
  order.sort((p, q) => {
    const a = points[p] as Corner
    const b = points[q] as Corner
    return a[0] - b[0] || a[1] - b[1]
  })
  if (order.length === 1) return [[0, 0]]
  return order.slice(1).map((b, index) => [order[index] as number, b])
}

function nearestOn(points: Corner[], pieces: [number, number][], x: number, y: number): number {
  let best = Number.POSITIVE_INFINITY
  let level = 0
  for (const [i, j] of pieces) {
    const a = points[i] as Corner
    const b = points[j] as Corner
    const square = (b[0] - a[0]) ** 2 + (b[1] - a[1]) ** 2
    const along = square === 0 ? 0 : ((x - a[0]) * (b[0] - a[0]) + (y - a[1]) * (b[1] - a[1])) / square
    const t = Math.min(1, Math.max(0, along))
    const distance = Math.hypot(a[0] + t * (b[0] - a[0]) - x, a[1] + t * (b[1] - a[1]) - y)
    if (distance < best) {
      best = distance
      level = a[2] + t * (b[2] - a[2])
    }
  }
  return level
}
