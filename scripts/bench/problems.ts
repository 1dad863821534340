import type { LinearSystem } from '../../app/solver/linear/system.ts'
import { fourier } from './fourier.ts'

/** A five-point system with its right-hand side. */
export interface Problem {
  name: string
  columns: number
  rows: number
  east: Float64Array
  north: Float64Array
  own: Float64Array
  b: Float64Array
}

export type Kind = 'P1' | 'P2' | 'P3'

export function systemOf({ columns, rows, east, north, own }: Problem): LinearSystem {
  return { columns, rows, east, north, northEast: null, northWest: null, own }
}

/** Uniform numbers from 0 to 1, the same on every machine (xorshift128+, Vigna 2017, seeded by splitmix64's constants). */
export function numbersFrom(seed: number): () => number {
  let a = BigInt(seed) * 0x9e3779b97f4a7c15n + 0xbf58476d1ce4e5b9n
  const mask = 0xffffffffffffffffn
  a &= mask
  let state = Uint32Array.of(Number(a & 0xffffffffn), Number(a >> 32n), seed ^ 0x94d049bb, 0x133111eb)
  const step = () => {
    let t = state[3] as number
    const s = state[0] as number
    t ^= t << 11
    t ^= t >>> 8
    state = Uint32Array.of((t ^ s ^ (s >>> 19)) >>> 0, s, state[1] as number, state[2] as number)
    return state[0] as number
  }
  for (let k = 0; k < 20; k++) step()
  return () => (step() + 0.5) / 4294967296
}

/**
 * ln K of n x n cells, n a power of two: a normal field of standard deviation `sigma` whose correlation falls by e in
 * `length` cells, by filtering white noise with the root of the spectrum of the wrapped-around exponential covariance.
 */
function field(n: number, next: () => number, length = 10, sigma = 2): Float64Array {
  const spectrum = new Float64Array(n * n)
  const none = new Float64Array(n * n)
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      const apart = Math.hypot(Math.min(i, n - i), Math.min(j, n - j))
      spectrum[j * n + i] = Math.exp(-apart / length)
    }
  }
  fourier(spectrum, none, n, false)
  const real = new Float64Array(n * n)
  const imaginary = new Float64Array(n * n)
  for (let c = 0; c < n * n; c++) {
    real[c] = Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next())
  }
  fourier(real, imaginary, n, false)
  for (let c = 0; c < n * n; c++) {
    const root = Math.sqrt(Math.max(spectrum[c] as number, 0))
    real[c] = (real[c] as number) * root
    imaginary[c] = (imaginary[c] as number) * root
  }
  fourier(real, imaginary, n, true)
  const mean = real.reduce((sum, value) => sum + value, 0) / real.length
  const spread = Math.sqrt(real.reduce((sum, value) => sum + (value - mean) ** 2, 0) / real.length)
  return real.map((value) => ((value - mean) * sigma) / spread)
}

function harmonic(a: number, b: number): number {
  return (2 * a * b) / (a + b)
}

const recharged = 16.384

/**
 * P1: one material between four fixed sides. P2: log-normal conductivity (sigma of ln K 2) with 20 wells between two
 * fixed sides. P3: the same ground ten times as conductive along x, with walls of 1e-6 (one around a zone), a winding
 * channel of 1e3 and one short fixed segment. n x n cells, n a power of two; the same arrays at every call.
 */
export function problemOf(kind: Kind, n: number): Problem {
  const next = numbersFrom(12345 + n)
  const count = n * n
  const east = new Float64Array(count)
  const north = new Float64Array(count)
  const own = new Float64Array(count)
  const b = new Float64Array(count).fill(recharged / count)
  const problem = { name: `${kind} ${n}`, columns: n, rows: n, east, north, own, b }
  function add(values: Float64Array, i: number, j: number, value: number): void {
    values[j * n + i] = (values[j * n + i] as number) + value
  }
  if (kind === 'P1') {
    for (let k = 0; k < n; k++) {
      for (let m = 0; m < n - 1; m++) {
        east[k * n + m] = 1
        north[m * n + k] = 1
      }
      add(own, 0, k, 2)
      add(own, n - 1, k, 2)
      add(own, k, 0, 2)
      add(own, k, n - 1, 2)
    }
    return problem
  }
  const k = field(n, next).map(Math.exp)
  const wells = Array.from({ length: 20 }, () => {
    const place = () => n / 16 + Math.floor(next() * (n - n / 8))
    return { i: place(), j: place() }
  })
  const alongY = kind === 'P3' ? 0.1 : 1
  const box = {
    x: [Math.floor(0.55 * n), Math.floor(0.75 * n)],
    y: [Math.floor(0.15 * n), Math.floor(0.4 * n)],
  }
  const [x0, x1, y0, y1] = [...box.x, ...box.y] as [number, number, number, number]
  if (kind === 'P3') {
    const tight = (i: number, j: number) => {
      k[j * n + i] = 1e-6
    }
    const halfWidth = 3 + Math.floor(n / 512)
    for (let i = 0; i < n; i++) {
      const middle = Math.floor(0.5 * n + 0.22 * n * Math.sin((3 * Math.PI * i) / n))
      for (let j = Math.max(0, middle - halfWidth); j <= Math.min(n - 1, middle + halfWidth); j++) {
        k[j * n + i] = 1e3
      }
    }
    for (let j = Math.floor(0.1 * n); j < Math.floor(0.9 * n); j++) tight(Math.floor(0.3 * n), j)
    for (let i = Math.floor(0.4 * n); i < Math.floor(0.95 * n); i++) tight(i, Math.floor(0.6 * n))
    for (let i = x0; i <= x1; i++) {
      tight(i, y0)
      tight(i, y1)
    }
    for (let j = y0; j <= y1; j++) {
      tight(x0, j)
      tight(x1, j)
    }
    for (let s = 0; s < Math.floor(0.25 * n); s++) {
      tight(Math.floor(0.45 * n) + s, Math.floor(0.65 * n) + s)
      tight(Math.floor(0.45 * n) + s + 1, Math.floor(0.65 * n) + s)
    }
  }
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      const c = j * n + i
      if (i < n - 1) east[c] = harmonic(k[c] as number, k[c + 1] as number)
      if (j < n - 1) north[c] = alongY * harmonic(k[c] as number, k[c + n] as number)
    }
  }
  const inBox = (i: number, j: number, rim: number) =>
    i >= x0 - rim && i <= x1 + rim && j >= y0 - rim && j <= y1 + rim
  if (kind === 'P2') {
    for (let j = 0; j < n; j++) {
      own[j * n] = 2 * (k[j * n] as number)
      own[j * n + n - 1] = 2 * (k[j * n + n - 1] as number)
      add(b, 0, j, 10 * (own[j * n] as number))
    }
  } else {
    for (let j = y0; j <= y1; j++) for (let i = x0; i <= x1; i++) b[j * n + i] = 0
    const start = Math.floor(0.48 * n)
    for (let j = start; j < start + Math.max(4, Math.floor(n / 32)); j++)
      own[j * n] = 2 * (k[j * n] as number)
  }
  for (const { i, j } of wells) {
    const moved = kind === 'P3' && inBox(i, j, 2) ? (j + n / 2) % n : j
    add(b, i, moved, (-0.5 * recharged) / wells.length)
  }
  return problem
}
