import type { Result, Warning } from '~/solver/result'
import { formatNumber } from '~/units'

/** What a result says about itself, in words: the same on page and in the package. */

export const severityWords: Record<Warning['severity'], string> = {
  serious: 'Not to be used as it is',
  check: 'Look before use',
  note: 'For information',
}

/** Warnings with the gravest first. */
export function byGravity(warnings: readonly Warning[]): Warning[] {
  const order: Warning['severity'][] = ['serious', 'check', 'note']
  return [...warnings].sort((a, b) => order.indexOf(a.severity) - order.indexOf(b.severity))
}

/** The methods in words, for a run's record and the package. */
export const methodWords: Record<Result['method'], string> = {
  sor: 'red-black successive over-relaxation',
  multigrid: 'conjugate gradients with multigrid',
}

/** What did the arithmetic. Results of before there was a choice do not say: theirs was the TypeScript one. */
export function kernelsInWords(kernels: string | undefined): string {
  return kernels === undefined || kernels === 'typescript'
    ? 'TypeScript kernels'
    : `compiled kernels (${kernels})`
}

/** What a method counts: sweeps over the grid, or iterations of conjugate gradients. */
export function iterationsWord(method: Result['method']): 'sweeps' | 'iterations' {
  return method === 'sor' ? 'sweeps' : 'iterations'
}

/** "36 000 cells, conjugate gradients with multigrid, TypeScript kernels, 12 iterations, residual 3·10⁻¹¹, water-balance error 2·10⁻⁹ %". */
export function recordInWords(result: Result): string {
  const { active, cells } = result.grid
  const error = result.balance.errorPercent.at(-1)
  return [
    active === cells
      ? `${formatNumber(cells, 0)} cells`
      : `${formatNumber(active, 0)} of ${formatNumber(cells, 0)} cells`,
    methodWords[result.method],
    kernelsInWords(result.kernels),
    `${formatNumber(result.iterations, 0)} ${iterationsWord(result.method)}`,
    `residual ${shortly(result.residual)}`,
    ...(error === undefined ? [] : [`water-balance error ${errorInWords(error)}`]),
  ].join(', ')
}

/** Two figures are enough for a residual or an error. */
function shortly(value: number): string {
  if (value === 0) return '0'
  return formatNumber(Number(value.toPrecision(2)))
}

/** The water-balance error, in percent, to two figures; what is below rounding is said to be. */
export function errorInWords(percent: number): string {
  return Math.abs(percent) < 1e-4 ? 'below 0.0001 %' : `${shortly(percent)} %`
}

/** Error of the water balance above which a run is no result, in percent of the inflow (common practice, no source). */
export const mostBalanceError = 0.1

/** A steady balance closes far below its limit; one that is out by more than 1 % is not a balance. */
export function balanceState(percent: number): 'good' | 'warn' | 'alarm' {
  const size = Math.abs(percent)
  return size <= mostBalanceError ? 'good' : size <= 1 ? 'warn' : 'alarm'
}

/** "north and part of west" for a sentence. */
export function listed(names: readonly string[]): string {
  if (names.length < 2) return names.join('')
  return `${names.slice(0, -1).join(', ')} and ${names.at(-1)}`
}
