import { describe, expect, it } from 'vitest'
import type { Position } from '~/solver/model'
import { abstraction, check, head, heldAllRound, relative, sheet, solvedByBoth } from './plan'

describe('PS-14 turned against the grid', () => {
  const { title, source, inputs, expected } = check<
    { Q_m3_s: number; Tx_m2_s: number; Ty_m2_s: number; points_xy_m: [number, number][] },
    {
      head_difference_point3_minus_point1: number
      head_difference_point3_minus_point2: number
      head_difference_point2_minus_point1: number
    }
  >('PS-14')
  const { Q_m3_s: rate, Tx_m2_s: tx, Ty_m2_s: ty } = inputs

  /** The formula in coordinates along the principal directions, which stand at `angle` to the grid. */
  function differences(angle: number, columns: number) {
    const [cosine, sine] = [Math.cos((angle * Math.PI) / 180), Math.sin((angle * Math.PI) / 180)]
    const along = ([x, y]: Position): Position => [cosine * x + sine * y, -sine * x + cosine * y]
    const turned = ([u, v]: Position): Position => [cosine * u - sine * v, sine * u + cosine * v]
    const level = (place: Position) => {
      const [u, v] = along(place)
      const r = Math.hypot(u * (ty / tx) ** 0.25, v * (tx / ty) ** 0.25)
      return 20 + (rate / (2 * Math.PI * Math.sqrt(tx * ty))) * Math.log(r / 100)
    }
    const extent = { x: [-300, 300], y: [-300, 300] } as { x: [number, number]; y: [number, number] }
    const ground = sheet(tx)
    const solution = solvedByBoth({
      ...ground,
      materials: [{ name: 'Ground', kx: tx, ky: ty, angle }],
      extent,
      grid: { columns, rows: columns },
      boundaries: heldAllRound(extent, level),
      wells: [abstraction(0, 0, rate, 0.15)],
      points: inputs.points_xy_m.map((place, k) => {
        const [x, y] = turned(place)
        return { name: `${k + 1}`, x, y }
      }),
    })
    const [one, two, three] = ['1', '2', '3'].map((name) => head(solution, name)) as [number, number, number]
    return {
      errors: [
        relative(three - one, expected.head_difference_point3_minus_point1),
        relative(three - two, expected.head_difference_point3_minus_point2),
        relative(two - one, expected.head_difference_point2_minus_point1),
      ],
      wellHead: solution.result.wells[0]?.wellHead[0] as number,
      exactWellHead:
        20 +
        (rate / (2 * Math.PI * Math.sqrt(tx * ty))) *
          Math.log(((Math.sqrt(ty / tx) ** 0.5 + Math.sqrt(tx / ty) ** 0.5) / 2) * (0.15 / 100)),
    }
  }

  it.each([0, 30, 63])(
    `${title}, at %d degrees: within two percent on 5 m cells, at the well face within a millimetre (${source})`,
    (angle) => {
      const { errors, wellHead, exactWellHead } = differences(angle, 120)
      for (const error of errors) expect(error).toBeLessThan(0.02)
      expect(Math.abs(wellHead - exactWellHead)).toBeLessThan(0.001)
    },
  )

  it('at 45 degrees the well face is as right off the centre of its cell, and on cells of any size', () => {
    for (const columns of [40, 61]) {
      const { wellHead, exactWellHead } = differences(45, columns)
      expect(Math.abs(wellHead - exactWellHead)).toBeLessThan(0.001)
    }
  })
})
