/** Solves a small dense system by Gaussian elimination with partial pivoting. `matrix` and `right` are kept. */
export function solveDense(matrix: number[][], right: number[]): number[] {
  const n = right.length
  const rows = matrix.map((row, index) => [...row, right[index] as number])
  for (let k = 0; k < n; k++) {
    let pivot = k
    for (let i = k + 1; i < n; i++) {
      if (Math.abs((rows[i] as number[])[k] as number) > Math.abs((rows[pivot] as number[])[k] as number))
        pivot = i
    }
    const swap = rows[k] as number[]
    rows[k] = rows[pivot] as number[]
    rows[pivot] = swap
    const top = rows[k] as number[]
    for (let i = k + 1; i < n; i++) {
      const row = rows[i] as number[]
      const factor = (row[k] as number) / (top[k] as number)
      if (factor === 0) continue
      for (let m = k; m <= n; m++) row[m] = (row[m] as number) - factor * (top[m] as number)
    }
  }
  const solution = Array.from({ length: n }, () => 0)
  for (let k = n - 1; k >= 0; k--) {
    const row = rows[k] as number[]
    let sum = row[n] as number
    for (let m = k + 1; m < n; m++) sum -= (row[m] as number) * (solution[m] as number)
    solution[k] = sum / (row[k] as number)
  }
  return solution
}
