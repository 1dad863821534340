import { useEffect, useState } from 'react'
import { decodeHeads } from '~/solver/heads-buffer'
import type { HeadField } from './field'

export type LoadedHeads =
  | { state: 'loading' }
  | { state: 'failed'; message: string }
  | { state: 'here'; field: HeadField }

// A run never changes: its heads are fetched once a visit. The oldest of a few goes when another comes.
const kept = new Map<string, HeadField>()
const most = 4

/**
 * The head field of a finished run, in its own unit of length times `factor` (to compare runs of different units);
 * null when `address` is.
 */
export function useHeads(address: string | null, factor = 1): LoadedHeads | null {
  const [loaded, setLoaded] = useState<LoadedHeads>({ state: 'loading' })
  useEffect(() => {
    if (!address) return
    const key = `${address} ${factor}`
    const before = kept.get(key)
    if (before) {
      setLoaded({ state: 'here', field: before })
      return
    }
    const controller = new AbortController()
    setLoaded({ state: 'loading' })
    fetchHeads(address, controller.signal).then(
      (field) => {
        const scaled = factor === 1 ? field : { ...field, heads: field.heads.map((head) => head * factor) }
        if (kept.size >= most) kept.delete(kept.keys().next().value ?? '')
        kept.set(key, scaled)
        setLoaded({ state: 'here', field: scaled })
      },
      (error: unknown) => {
        if (controller.signal.aborted) return
        setLoaded({
          state: 'failed',
          message: error instanceof Error ? error.message : 'The heads did not arrive.',
        })
      },
    )
    return () => controller.abort()
  }, [address, factor])
  return address ? loaded : null
}

async function fetchHeads(address: string, signal: AbortSignal): Promise<HeadField> {
  const answer = await fetch(address, { signal })
  if (!answer.ok) throw new Error(`The server answered ${answer.status} instead of the heads of this run.`)
  const { grid, heads } = decodeHeads(await answer.arrayBuffer())
  return { xEdges: grid.xEdges, yEdges: grid.yEdges, heads }
}
