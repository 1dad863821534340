// Where numbers lie. `level` is the address of a nine-point level's first array; its arrays, `size` bytes each, follow
// one another in this order. A row is `stride` bytes: first its even columns (four numbers of rim, then the columns,
// then zeros up to a multiple of four), then, `half` bytes on, its odd columns in the same way. One row of zeros lies
// before row 0 and one after the last, so that no neighbour needs a test: links out of the grid are zero.

export const EAST: usize = 0
export const NORTH: usize = 1
export const NORTH_EAST: usize = 2
export const NORTH_WEST: usize = 3
export const OWN: usize = 4
export const INVERSE: usize = 5
export const X: usize = 6
export const B: usize = 7
export const R: usize = 8

// Address of row j's first even column in an array of single-precision numbers.
// @ts-ignore: decorator
@inline
export function rowAt(array: usize, stride: usize, j: i32): usize {
  return array + <usize>(j + 1) * stride + 16
}

// Address of the cell (i, j) of a nine-point level's array.
// @ts-ignore: decorator
@inline
export function cellAt(array: usize, stride: usize, half: usize, i: i32, j: i32): usize {
  return array + <usize>(j + 1) * stride + 16 + <usize>(i & 1) * half + ((<usize>(i >> 1)) << 2)
}
