import { centresBetween, type HeadField } from './field'

/**
 * Heads cell by cell as CSV parts for a file: x, y of the centre and the head, and the drawdown where there is one.
 * Cells without a head are left out. In parts, since four million cells make one string too long.
 */
export function headsCsv(heads: HeadField, drawdown: HeadField | null, unit: string): string[] {
  const x = centresBetween(heads.xEdges)
  const y = centresBetween(heads.yEdges)
  const parts = [`\ufeffx (${unit}),y (${unit}),head (${unit})${drawdown ? `,drawdown (${unit})` : ''}\r\n`]
  for (let j = 0; j < y.length; j++) {
    let row = ''
    for (let i = 0; i < x.length; i++) {
      const head = heads.heads[j * x.length + i] as number
      if (Number.isNaN(head)) continue
      const drawn = drawdown?.heads[j * x.length + i]
      const last = drawn === undefined ? '' : `,${Number.isNaN(drawn) ? '' : rounded(drawn)}`
      row += `${rounded(x[i] as number)},${rounded(y[j] as number)},${rounded(head)}${last}\r\n`
    }
    if (row !== '') parts.push(row)
  }
  return parts
}

/** Ten significant figures: more than any head is worth, without the noise of binary fractions. */
function rounded(value: number): string {
  return String(Number(value.toPrecision(10)))
}
