// Where the numbers of the five-point finest level lie: red cells (column + row even) and black ones apart, both with
// cell (i, j) at place i >> 1 of row j. `single` is the address of the first array of single-precision numbers, `size`
// bytes each, `stride` bytes a row: four numbers of rim, the cells, zeros up to a multiple of four. `double` is that of
// the arrays of double-precision numbers with all of that twice. Two rows of zeros lie before and after. Every link
// joins a red cell to a black one and is kept with the red one.

export const WEST: usize = 0
export const EAST: usize = 1
export const SOUTH: usize = 2
export const NORTH: usize = 3
// Single precision
export const RED_INVERSE: usize = 4
export const BLACK_INVERSE: usize = 5
export const SCALED: usize = 6 // red: residual / diagonal
export const Z: usize = 7 // red: what the cycle makes of it
export const BLACK: usize = 8 // black cells of either
export const REST: usize = 9 // red: residual left to the coarse level
// Double precision
export const RED_OWN: usize = 4
export const BLACK_UNIT: usize = 5 // 1 / diagonal
export const BLACK_OWN: usize = 6 // only until the coarse matrix is made; then black values at work
export const P: usize = 7
export const Q: usize = 8
export const RED_X: usize = 9
export const RED_R: usize = 10

// @ts-ignore: decorator
@inline
export function singleRow(single: usize, stride: usize, j: i32): usize {
  return single + <usize>(j + 2) * stride + 16
}

// @ts-ignore: decorator
@inline
export function doubleRow(double: usize, stride: usize, j: i32): usize {
  return double + 2 * (<usize>(j + 2) * stride + 16)
}
