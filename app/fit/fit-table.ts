import type { Cell } from '~/components/spreadsheet'
import type { FitLine } from './fit'

/** The fit sheet as a table, its heads in the project's unit already: what is copied and downloaded. */
export function fitTable(lines: readonly FitLine[], unit: string): Cell[][] {
  return [
    [
      'Instrument',
      `x (${unit})`,
      `y (${unit})`,
      `Measured (${unit})`,
      `Modelled (${unit})`,
      `Residual = measured - modelled (${unit})`,
      'n',
      'First reading (UTC)',
      'Last reading (UTC)',
      'Note',
    ],
    ...lines.map((line): Cell[] => [
      line.name,
      line.x,
      line.y,
      line.measured,
      line.modelled,
      line.residual,
      line.n,
      line.firstAt,
      line.lastAt,
      line.why,
    ]),
  ]
}
