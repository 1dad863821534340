/** In-place transform of 2^k numbers, `step` apart, by decimation in time (Cooley & Tukey 1965); unscaled. */
function line(
  real: Float64Array,
  imaginary: Float64Array,
  n: number,
  start: number,
  step: number,
  sign: number,
): void {
  const at = (k: number) => start + k * step
  for (let i = 1, j = 0; i < n; i++) {
    let bit = n >> 1
    for (; j & bit; bit >>= 1) j ^= bit
    j ^= bit
    if (i >= j) continue
    for (const values of [real, imaginary]) {
      const kept = values[at(i)] as number
      values[at(i)] = values[at(j)] as number
      values[at(j)] = kept
    }
  }
  for (let length = 2; length <= n; length *= 2) {
    const angle = (sign * 2 * Math.PI) / length
    for (let k = 0; k < length / 2; k++) {
      const c = Math.cos(angle * k)
      const s = Math.sin(angle * k)
      for (let first = k; first < n; first += length) {
        const a = at(first)
        const b = at(first + length / 2)
        const re = c * (real[b] as number) - s * (imaginary[b] as number)
        const im = c * (imaginary[b] as number) + s * (real[b] as number)
        real[b] = (real[a] as number) - re
        imaginary[b] = (imaginary[a] as number) - im
        real[a] = (real[a] as number) + re
        imaginary[a] = (imaginary[a] as number) + im
      }
    }
  }
}

/** Fourier transform of n x n complex numbers in place, n a power of two; backwards divided by n^2. */
export function fourier(real: Float64Array, imaginary: Float64Array, n: number, backwards: boolean): void {
  const sign = backwards ? 1 : -1
  for (let k = 0; k < n; k++) line(real, imaginary, n, k * n, 1, sign)
  for (let k = 0; k < n; k++) line(real, imaginary, n, k, n, sign)
  if (!backwards) return
  for (const values of [real, imaginary]) {
    for (let c = 0; c < values.length; c++) values[c] = (values[c] as number) / (n * n)
  }
}
