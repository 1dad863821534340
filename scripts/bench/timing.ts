export function quantile(values: number[], share: number): number {
  const sorted = [...values].sort((a, b) => a - b)
  return sorted[Math.min(sorted.length - 1, Math.floor(share * sorted.length))] as number
}

export function median(values: number[]): number {
  return quantile(values, 0.5)
}

/** Bytes a second of a = b + s c over arrays much larger than any cache: reads two, writes one. */
export function triadBandwidth(): number {
  const n = 8 * 1024 * 1024
  const [a, b, c] = [new Float64Array(n), new Float64Array(n).fill(1), new Float64Array(n).fill(2)]
  const seconds: number[] = []
  for (let k = 0; k < 7; k++) {
    const started = performance.now()
    for (let m = 0; m < n; m++) a[m] = (b[m] as number) + 3 * (c[m] as number)
    seconds.push((performance.now() - started) / 1000)
  }
  return (3 * 8 * n) / median(seconds.slice(2))
}
