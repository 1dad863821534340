/** The arithmetic of the fast method, compiled. Without one its TypeScript twin serves. */
export interface Kernels {
  /** What a run reports: 'wasm-simd', 'wasm-simd, 2 threads'. */
  name: string
}
