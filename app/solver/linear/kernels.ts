import type { SecondThread } from './team'

/** What the compiled module exports (kernels/): addresses and sizes in bytes, rows from..to - 1. */
export interface KernelExports {
  black(single: number, size: number, stride: number, source: number, from: number, to: number): void
  correctAlong: Between
  correctBoth: Correction
  correctRedAlong: RedBetween
  correctRedBoth: RedCorrection
  dense(
    level: number,
    size: number,
    stride: number,
    half: number,
    columns: number,
    rows: number,
    inverse: number,
    width: number,
    natural: number,
  ): void
  direction(
    single: number,
    size: number,
    stride: number,
    double: number,
    beta: number,
    from: number,
    to: number,
  ): void
  eliminate(
    size: number,
    stride: number,
    double: number,
    source: number,
    withSource: number,
    from: number,
    to: number,
  ): void
  galerkinAlong(...numbers: number[]): void
  galerkinBoth(...numbers: number[]): void
  galerkinRedAlong: RedGalerkin
  galerkinRedBoth: RedGalerkin
  invert: Sweep
  invertCoarsest(
    level: number,
    size: number,
    stride: number,
    half: number,
    columns: number,
    rows: number,
    inverse: number,
    width: number,
    work: number,
    wide: number,
  ): void
  joined(
    size: number,
    stride: number,
    double: number,
    columns: number,
    into: number,
    red: number,
    black: number,
    from: number,
    to: number,
  ): void
  joinedWithGaps(
    single: number,
    size: number,
    stride: number,
    double: number,
    columns: number,
    into: number,
    red: number,
    black: number,
    from: number,
    to: number,
  ): void
  largest(size: number, stride: number, double: number, array: number, from: number, to: number): number
  load5(
    single: number,
    size: number,
    stride: number,
    double: number,
    columns: number,
    rows: number,
    east: number,
    north: number,
    own: number,
    from: number,
    to: number,
  ): number
  parted(
    size: number,
    stride: number,
    double: number,
    columns: number,
    given: number,
    red: number,
    black: number,
    from: number,
    to: number,
  ): void
  product(size: number, stride: number, double: number, from: number, to: number): number
  redLast(single: number, size: number, stride: number, double: number, from: number, to: number): number
  redRest(single: number, size: number, stride: number, from: number, to: number): void
  relax(
    level: number,
    size: number,
    stride: number,
    half: number,
    from: number,
    to: number,
    backwards: number,
  ): void
  residual: Sweep
  restrictAlong: Between
  restrictBoth: Between
  restrictRedAlong: RedBetween
  restrictRedBoth: RedBetween
  sharesOf(
    level: number,
    size: number,
    stride: number,
    half: number,
    columns: number,
    rows: number,
    shares: number,
    sharesSize: number,
    along: number,
    from: number,
    to: number,
  ): void
  sharesRedBoth(
    size: number,
    stride: number,
    double: number,
    columns: number,
    rows: number,
    shares: number,
    sharesSize: number,
    from: number,
    to: number,
  ): void
  startEven: Sweep
  startOdd: Sweep
  startResidual: Sweep
  step(
    single: number,
    size: number,
    stride: number,
    double: number,
    alpha: number,
    scale: number,
    from: number,
    to: number,
  ): number
  trueResidual(
    single: number,
    size: number,
    stride: number,
    double: number,
    scale: number,
    from: number,
    to: number,
  ): number
}

type Sweep = (level: number, size: number, stride: number, half: number, from: number, to: number) => void

/** level, size, stride, half, shares, sharesSize, coarse level, its size, stride and half, memory for a row. */
type Between = (
  level: number,
  size: number,
  stride: number,
  half: number,
  shares: number,
  sharesSize: number,
  coarse: number,
  coarseSize: number,
  coarseStride: number,
  coarseHalf: number,
  natural: number,
  from: number,
  to: number,
) => void

type Correction = (
  level: number,
  size: number,
  stride: number,
  half: number,
  shares: number,
  sharesSize: number,
  coarse: number,
  coarseSize: number,
  coarseStride: number,
  coarseHalf: number,
  natural: number,
  apart: number,
  from: number,
  to: number,
) => void

type RedBetween = (
  single: number,
  size: number,
  stride: number,
  shares: number,
  sharesSize: number,
  coarse: number,
  coarseSize: number,
  coarseStride: number,
  coarseHalf: number,
  natural: number,
  from: number,
  to: number,
) => void

type RedCorrection = (
  single: number,
  size: number,
  stride: number,
  shares: number,
  sharesSize: number,
  coarse: number,
  coarseSize: number,
  coarseStride: number,
  coarseHalf: number,
  natural: number,
  apart: number,
  from: number,
  to: number,
) => void

type RedGalerkin = (
  size: number,
  stride: number,
  double: number,
  columns: number,
  shares: number,
  sharesSize: number,
  coarse: number,
  coarseSize: number,
  coarseStride: number,
  coarseHalf: number,
  from: number,
  to: number,
) => void

/** Pages of 64 KB that a solver's memory may grow to: as many as there are addresses. */
export const mostPages = 65536

/**
 * The arithmetic of the fast method, compiled. Without it its TypeScript twin serves. It can be sent to a worker, which
 * then has nothing to compile, but for the second thread.
 */
export interface Kernels {
  /** What a run reports. */
  name: string
  module: WebAssembly.Module
  /** The same for memory that threads share. */
  shared: WebAssembly.Module
  /** A second thread (second.thread.ts), if there is one. */
  second?: SecondThread
}

/**
 * Compiles the module of kernels/ from its bytes, at once: on a server's thread or in a web worker. Throws
 * WebAssembly.CompileError where the machine has no SIMD of WebAssembly: then do without.
 */
export function instantiateKernels(bytes: Uint8Array<ArrayBuffer>): Kernels {
  return {
    name: 'wasm-simd',
    module: new WebAssembly.Module(bytes),
    shared: new WebAssembly.Module(withSharedMemory(bytes)),
  }
}

/** The same kernels with a second thread to share large systems with. */
export function withTwoThreads({ module, shared }: Kernels, second: SecondThread): Kernels {
  return { name: 'wasm-simd, 2 threads', module, shared, second }
}

/**
 * The module's one import is its memory; its limits' flags say whether threads may share it (WebAssembly core
 * specification with threads, binary format: 1 has a maximum, 3 has one and is shared).
 */
function withSharedMemory(bytes: Uint8Array<ArrayBuffer>): Uint8Array<ArrayBuffer> {
  const changed = bytes.slice()
  let at = 8
  function number(): number {
    let value = 0
    for (let shift = 0; ; shift += 7) {
      const byte = changed[at++] ?? 0
      value |= (byte & 127) << shift
      if (byte < 128) return value
    }
  }
  while (at < changed.length) {
    const section = changed[at++]
    const size = number()
    if (section !== 2) {
      at += size
      continue
    }
    number()
    // The names of the module and of the import, each with its length before it, and the kind: 2 is a memory.
    for (let name = 0; name < 2; name++) {
      const length = number()
      at += length
    }
    if (changed[at] === 2 && changed[at + 1] === 1) changed[at + 1] = 3
    break
  }
  return changed
}
