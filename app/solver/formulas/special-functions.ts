const euler = 0.5772156649015329

/**
 * The exponential integral E1(u), Theis' well function W(u), for u > 0: its series up to 1 (Abramowitz & Stegun 1964,
 * 5.1.11), its continued fraction beyond (5.1.22, evaluated by Lentz 1976). Relative error about 1e-15.
 */
export function wellFunction(u: number): number {
  if (u <= 1) {
    let term = 1
    let sum = 0
    for (let n = 1; n < 60; n++) {
      term *= -u / n
      sum -= term / n
      if (Math.abs(term) < 1e-18) break
    }
    return -euler - Math.log(u) + sum
  }
  let b = u + 1
  let c = Number.POSITIVE_INFINITY
  let d = 1 / b
  let value = d
  for (let n = 1; n < 500; n++) {
    const a = -n * n
    b += 2
    d = 1 / (a * d + b)
    c = b + a / c
    const factor = c * d
    value *= factor
    if (Math.abs(factor - 1) < 1e-16) break
  }
  return value * Math.exp(-u)
}

/**
 * The modified Bessel function K0(x), x > 0: its series up to 2 (Abramowitz & Stegun 1964, 9.6.13), beyond the
 * integral of exp(-x cosh t) over t > 0 (9.6.24) by the trapezoidal rule, which converges geometrically here.
 */
export function besselK0(x: number): number {
  if (x <= 2) {
    const square = (x * x) / 4
    let term = 1
    let i0 = 1
    let harmonic = 0
    let sum = 0
    for (let n = 1; n < 40; n++) {
      term *= square / (n * n)
      harmonic += 1 / n
      i0 += term
      sum += harmonic * term
      if (term < 1e-18 * i0) break
    }
    return -(Math.log(x / 2) + euler) * i0 + sum
  }
  const step = 0.0625
  let sum = 0.5
  for (let k = 1; k < 400; k++) {
    // cosh t - 1 = 2 sinh^2 (t / 2) keeps its digits; exp(-x) is taken out of the sum.
    const term = Math.exp(-2 * x * Math.sinh((k * step) / 2) ** 2)
    sum += term
    if (term < 1e-18) break
  }
  return step * sum * Math.exp(-x)
}

/** Abscissae and weights of Gauss' rule of eight points on -1..1, the positive half (Abramowitz & Stegun 1964, 25.4). */
const gauss: [x: number, weight: number][] = [
  [0.1834346424956498, 0.362683783378362],
  [0.525532409916329, 0.3137066458778873],
  [0.7966664774136267, 0.2223810344533745],
  [0.9602898564975363, 0.1012285362903763],
]

/**
 * The well function of leaky ground W(u, b), the integral of exp(-y - b^2 / 4y) / y over y > u (Hantush & Jacob 1955):
 * with y = b e^t / 2 that of exp(-b cosh t) over t > ln(2u / b), by Gauss' rule on short pieces. b = 0 gives W(u).
 */
export function leakyWellFunction(u: number, b: number): number {
  if (b < 1e-8) return wellFunction(u)
  const piece = 0.25
  // Beyond here the integrand is below 1e-300.
  const end = Math.log(1400 / b) + 1
  let sum = 0
  for (let t = Math.log((2 * u) / b); t < end; t += piece) {
    const middle = t + piece / 2
    let part = 0
    for (const [x, weight] of gauss) {
      const half = (x * piece) / 2
      part += weight * (Math.exp(-b * Math.cosh(middle - half)) + Math.exp(-b * Math.cosh(middle + half)))
    }
    sum += (part * piece) / 2
    if (t > 0 && part < 1e-18 * sum) break
  }
  return sum
}
