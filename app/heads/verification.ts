import { listed } from '~/heads/account'
import type { Band, Result } from '~/solver/result'
import { formatNumber } from '~/units'

/** "2.048 to 2.053"; '–' where the verification had nothing to judge a value by. */
export function bandInWords(band: Band | undefined, decimals = 3): string {
  return band ? `${formatNumber(band[0], decimals)} to ${formatNumber(band[1], decimals)}` : '–'
}

/** What a band counts and what it does not, for the foot of a table that prints bands. */
export const bandMeaning =
  'A band is the value and the estimated error of its grid, of its steps in time and of stopping the iterations. It says nothing of the inputs, of the outer boundary or of what the method leaves out.'

/** One line of what a run's own verification did: what was tried, what came of it, and what that is held against. */
export type VerificationLine = [what: string, found: string, against: string]

/**
 * What the run found by testing itself, in lines for a table; none where the case did not ask for it. The result is
 * that of one moment (`resultAt`); `length` is its unit of length.
 */
export function verificationLines(result: Result, length: string): VerificationLine[] {
  const { verification } = result
  if (!verification) return []
  const { grid, time, outerBoundary, formula } = verification
  const lines: VerificationLine[] = [
    [
      'Grids compared',
      grid.grids.length < 2
        ? 'only its own'
        : `${listed(grid.grids.map(({ cells }) => formatNumber(cells, 0)))} cells`,
      grid.why,
    ],
  ]
  const widest = widestBand(result)
  if (widest)
    lines.push([
      'Widest band of a head',
      `${widest.name}: ${bandInWords(widest.band)} ${length}`,
      'the accuracy needed, section 1',
    ])
  if (time)
    lines.push([
      'Steps in time halved',
      time.halved ? 'done, and part of the bands' : `not done: ${time.why ?? 'it did not converge'}`,
      'the same steps, unhalved',
    ])
  for (const { text, done } of outerBoundary) {
    const change = done ? largestChange(result, text) : null
    lines.push([
      'Outer boundary swapped',
      change
        ? `heads change by up to ${formatNumber(change.by, 2)} ${length}, most at ${change.name}`
        : done
          ? 'no head at a point to compare'
          : 'not done',
      text,
    ])
  }
  if (formula) {
    const differences = formula.results.flatMap(({ difference }) => difference.filter((one) => one !== null))
    lines.push([
      'Formula that holds for this case',
      differences.length > 0
        ? `differs by at most ${formatNumber(Math.max(...differences.map(Math.abs)))} (${formula.results.length === 1 ? 'one result' : `${formula.results.length} results`})`
        : 'no result to compare',
      `${formula.name} (${formula.source})`,
    ])
  }
  return lines
}

function widestBand({ points, wells }: Result): { name: string; band: NonNullable<Band> } | null {
  let widest: { name: string; band: NonNullable<Band> } | null = null
  for (const { name, band } of [...points, ...wells]) {
    const own = band?.[0]
    if (own && (!widest || own[1] - own[0] > widest.band[1] - widest.band[0])) widest = { name, band: own }
  }
  return widest
}

/** The named point whose head another outer boundary changes most. */
function largestChange({ points, verification }: Result, text: string): { name: string; by: number } | null {
  let largest: { name: string; by: number } | null = null
  for (const { name, head } of points) {
    const found = verification?.results.find((one) => one.name === `points/${name}`)
    const other = found?.swapped.find((one) => one.text === text)?.values[0]
    const own = head[0]
    if (typeof own !== 'number' || typeof other !== 'number') continue
    const by = Math.abs(other - own)
    if (!largest || by > largest.by) largest = { name, by }
  }
  return largest
}
