import type { Boundary, Model } from '~/solver/model'

/** A small square site, 100 x 100 m, held at 12 m in the west and 11 m in the east; `changes` replace its fields. */
export function planModel(changes: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 100], y: [0, 100] },
    grid: { columns: 20, rows: 20 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 5, ky: 5 }],
    ground: [{ material: 'Sand', base: 0, top: 10 }],
    boundaries: [west(12), east(11)],
    ...changes,
  }
}

export function west(head: number): Boundary {
  return {
    name: 'West',
    kind: 'fixed head',
    line: [
      [0, 0],
      [0, 100],
    ],
    head,
  }
}

export function east(head: number): Boundary {
  return {
    name: 'East',
    kind: 'fixed head',
    line: [
      [100, 0],
      [100, 100],
    ],
    head,
  }
}
