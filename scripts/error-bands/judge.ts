import { namedValues } from '~/solver/named-values'
import { solveModel } from '~/solver/solve'
import { type KnownCase, knownCase } from './cases'

export interface Judged {
  kind: string
  name: string
  value: number
  truth: number
  error: number
  /** Half the width of the band; NaN: it has none. */
  band: number
  inside: boolean
  how: string
}

/** Solves a known case with verification and says of every result with a true value whether that lies in its band. */
export function judge({ kind, model, truth }: KnownCase): Judged[] {
  const { result } = solveModel(model)
  if (!result.converged) throw new Error(`a case of kind "${kind}" did not converge`)
  const values = new Map(namedValues(result).map((entry) => [entry.name, entry.values.at(-1) ?? null]))
  const bands = new Map((result.verification?.results ?? []).map((entry) => [entry.name, entry]))
  return Object.entries(truth).map(([name, known]) => {
    const value = values.get(name) ?? Number.NaN
    const entry = bands.get(name)
    const band = entry?.band.at(-1)
    return {
      kind,
      name,
      value,
      truth: known,
      error: Math.abs(value - known),
      band: band ? (band[1] - band[0]) / 2 : Number.NaN,
      inside: band ? known >= band[0] && known <= band[1] : false,
      how: entry?.how.at(-1) ?? 'none',
    }
  })
}

/** The first `count` cases of a series, judged. */
export function judgedCases(seed: number, count: number): Judged[] {
  return Array.from({ length: count }, (_, number) => judge(knownCase(seed, number))).flat()
}

/** Share of results whose true value lies inside their band. */
export function coverage(judged: Judged[]): number {
  return judged.filter(({ inside }) => inside).length / judged.length
}

/** Median of the ratio of band to true error, over the results that have an error to speak of. */
export function tightness(judged: Judged[]): number {
  const ratios = judged
    .filter(({ error, truth, band }) => error > 1e-9 * Math.max(1, Math.abs(truth)) && band > 0)
    .map(({ error, band }) => band / error)
    .sort((a, b) => a - b)
  return ratios[Math.floor(ratios.length / 2)] ?? Number.NaN
}
