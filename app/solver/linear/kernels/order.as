// A coarse row in the order of its columns, as fine rows need it, and split into even and odd columns, as its level has it.

// Writes `half` bytes' worth of columns from `natural` to both halves of the row that starts at `row`.
// @ts-ignore: decorator
@inline
export function splitRow(natural: usize, row: usize, half: usize): void {
  let from = natural
  for (let c = row; c < row + half - 16; c += 16, from += 32) {
    const a = v128.load(from)
    const b = v128.load(from, 16)
    v128.store(c, v128.shuffle<f32>(a, b, 0, 2, 4, 6))
    v128.store(c + half, v128.shuffle<f32>(a, b, 1, 3, 5, 7))
  }
}

// The other way round.
// @ts-ignore: decorator
@inline
export function joinRow(row: usize, natural: usize, half: usize): void {
  let to = natural
  for (let c = row; c < row + half - 16; c += 16, to += 32) {
    const even = v128.load(c)
    const odd = v128.load(c + half)
    v128.store(to, v128.shuffle<f32>(even, odd, 0, 4, 1, 5))
    v128.store(to, v128.shuffle<f32>(even, odd, 2, 6, 3, 7), 16)
  }
}
