import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { Matrix, solve } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { solveModel } from '~/solver/solve'
import published from './published.json'

const check = published.find((entry) => entry.id === 'OD-01') as unknown as {
  source: string
  expected: Record<
    'gradient' | 'rmse' | 'mae' | 'scaled_rmse' | 'r_squared' | 'leave_one_out_rmse',
    number
  > & {
    flow_direction_deg_clockwise_from_north: number
    plane: { h0: number; dh_dx: number; dh_dy: number }
  }
}
const { expected, source } = check

interface Measured {
  x: number
  y: number
  head: number
}

/** Positions in metres. */
const measured: Measured[] = readFileSync(join(import.meta.dirname, 'data/wolfcamp_heads.csv'), 'utf8')
  .trim()
  .split('\n')
  .slice(1)
  .map((line) => {
    const [x, y, head] = line.split(',').map(Number) as [number, number, number]
    return { x: 1000 * x, y: 1000 * y, head }
  })

function planeThrough(points: Measured[]): [h0: number, dhdx: number, dhdy: number] {
  const places = new Matrix(points.map(({ x, y }) => [1, x, y]))
  const heads = Matrix.columnVector(points.map(({ head }) => head))
  return solve(places, heads, true).to1DArray() as [number, number, number]
}

function rms(values: number[]): number {
  return Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length)
}

describe('OD-01', () => {
  const plane = planeThrough(measured)
  const level = (x: number, y: number) => plane[0] + plane[1] * x + plane[2] * y
  const heads = measured.map(({ head }) => head)
  const range = Math.max(...heads) - Math.min(...heads)

  it(`the plane through 85 measured heads and its statistics (${source})`, () => {
    expect(measured).toHaveLength(85)
    expect(plane[0]).toBeCloseTo(expected.plane.h0, 5)
    expect(plane[1]).toBeCloseTo(expected.plane.dh_dx, 8)
    expect(plane[2]).toBeCloseTo(expected.plane.dh_dy, 8)
    expect(Math.hypot(plane[1], plane[2])).toBeCloseTo(expected.gradient, 9)
    const direction = (Math.atan2(-plane[1], -plane[2]) * 180) / Math.PI
    expect(direction).toBeCloseTo(expected.flow_direction_deg_clockwise_from_north, 5)
    const residuals = measured.map(({ x, y, head }) => head - level(x, y))
    const mean = heads.reduce((sum, head) => sum + head, 0) / heads.length
    const spread = rms(heads.map((head) => head - mean))
    expect(1 - rms(residuals) ** 2 / spread ** 2).toBeCloseTo(expected.r_squared, 6)
    const left = measured.map((point) => {
      const [h0, dhdx, dhdy] = planeThrough(measured.filter((other) => other !== point))
      return point.head - (h0 + dhdx * point.x + dhdy * point.y)
    })
    expect(rms(left)).toBeCloseTo(expected.leave_one_out_rmse, 5)
  })

  it('one material with the heads of its edge leaves the residuals of that plane', () => {
    const box = { west: -240_000, east: 190_000, south: -150_000, north: 220_000 }
    for (const { x, y } of measured) {
      expect(x > box.west && x < box.east && y > box.south && y < box.north).toBe(true)
    }
    const corners = {
      sw: [box.west, box.south] as [number, number],
      se: [box.east, box.south] as [number, number],
      ne: [box.east, box.north] as [number, number],
      nw: [box.west, box.north] as [number, number],
    }
    const side = (name: string, from: [number, number], to: [number, number]) => ({
      name,
      kind: 'fixed head' as const,
      line: [from, to],
      head: [level(...from), level(...to)],
    })
    const { result } = solveModel({
      format: 'lavant-model',
      version: 1,
      units: { length: 'm', time: 'd' },
      kind: 'plan',
      flow: 'confined',
      extent: { x: [box.west, box.east], y: [box.south, box.north] },
      grid: { columns: 86, rows: 74 },
      time: { kind: 'steady' },
      materials: [{ name: 'Aquifer', kx: 1, ky: 1 }],
      ground: [{ material: 'Aquifer', base: -700, top: -600 }],
      boundaries: [
        side('South', corners.sw, corners.se),
        side('East', corners.se, corners.ne),
        side('North', corners.nw, corners.ne),
        side('West', corners.sw, corners.nw),
      ],
      points: measured.map(({ x, y }, index) => ({ name: `P${index + 1}`, x, y })),
    })
    expect(result.converged).toBe(true)
    const residuals = measured.map(({ head }, index) => head - (result.points[index]?.head[0] as number))
    expect(rms(residuals)).toBeCloseTo(expected.rmse, 5)
    expect(residuals.reduce((sum, residual) => sum + Math.abs(residual), 0) / 85).toBeCloseTo(expected.mae, 5)
    expect(rms(residuals) / range).toBeCloseTo(expected.scaled_rmse, 6)
  })
})
