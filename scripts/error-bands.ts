/**
 * node --import tsx scripts/error-bands.ts [cases] [seed]
 *
 * Solves random cases whose answer is known in closed form with verification, and prints how often the true value of a
 * named result lies inside its error band, and how wide bands are against true errors (median of their ratio).
 *
 * 2026-12-01, 200 cases, seed 1: of 871 results 99.5 % inside; half of the bands within 4.2 true errors; 33 s of
 * processor time.
 */
import { coverage, type Judged, judgedCases, tightness } from './error-bands/judge'

const required = 0.95
const [cases = 200, seed = 1] = process.argv.slice(2).map(Number)

function row(title: string, judged: Judged[]): string {
  const share = `${(100 * coverage(judged)).toFixed(1)} %`
  return `${title.padEnd(24)}${String(judged.length).padStart(8)}${share.padStart(10)}${tightness(judged).toPrecision(3).padStart(10)}`
}

const start = performance.now()
const judged = judgedCases(seed, cases)
const seconds = (performance.now() - start) / 1000
const kinds = [...new Set(judged.map(({ kind }) => kind))]
process.stdout.write(
  [
    `${cases} cases, seed ${seed}, ${seconds.toFixed(0)} s`,
    `${'kind'.padEnd(24)}${'results'.padStart(8)}${'inside'.padStart(10)}${'width'.padStart(10)}`,
    ...kinds.map((kind) =>
      row(
        kind,
        judged.filter((one) => one.kind === kind),
      ),
    ),
    row('all', judged),
    '',
  ].join('\n'),
)
process.exitCode = coverage(judged) >= required ? 0 : 1
