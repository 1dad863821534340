import { moveOneWell } from './live.ts'
import type { Kind } from './problems.ts'

/** Told { kernels, kinds, n, moves }; answers with the times of each kind. */
self.onmessage = async ({
  data,
}: MessageEvent<{ kernels: string; kinds: Kind[]; n: number; moves: number }>) => {
  const bytes = new Uint8Array(await (await fetch(data.kernels)).arrayBuffer())
  self.postMessage(data.kinds.map((kind) => moveOneWell(bytes, kind, data.n, data.moves)))
}
