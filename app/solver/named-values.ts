import type { Result } from './result'

/** A named result: one value a reported time; null where there is none. */
export interface NamedValue {
  /** "points/P1", "wells/W1", "lines/Base of dig", "rings/Site/through", "gradients/Dig level". */
  name: string
  values: (number | null)[]
  /** Heads are measured from a datum and flows are not. */
  quantity: 'head' | 'flow' | 'gradient'
  /** The head of a well's cells, where it has no radius: as low as the cells are small. */
  ofCells?: true
}

/** The results that carry an error band and can be asked for by name. A well's is the head at its face, if it has one. */
export function namedValues(result: Result): NamedValue[] {
  return [
    ...result.points.map(({ name, head }) => ({
      name: `points/${name}`,
      values: head,
      quantity: 'head' as const,
    })),
    ...result.wells.map(({ name, wellHead, cellHead }): NamedValue => {
      const named = { name: `wells/${name}`, quantity: 'head' as const }
      const atFace = wellHead.some((head) => head !== null)
      return atFace ? { ...named, values: wellHead } : { ...named, values: cellHead, ofCells: true }
    }),
    ...result.lines.map(({ name, discharge }) => ({
      name: `lines/${name}`,
      values: discharge,
      quantity: 'flow' as const,
    })),
    ...result.rings.map(({ name, through }) => ({
      name: `rings/${name}/through`,
      values: through,
      quantity: 'flow' as const,
    })),
    // Gradients are those at the end.
    ...(result.gradients ?? []).map(({ name, mean }) => ({
      name: `gradients/${name}`,
      values: [...result.times.slice(1).map(() => null), mean],
      quantity: 'gradient' as const,
    })),
  ]
}
