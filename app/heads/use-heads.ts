import { useEffect, useState } from 'react'
import { decodeHeads } from '~/solver/heads-buffer'
import type { HeadField } from './field'

export type LoadedHeads =
  | { state: 'loading' }
  | { state: 'failed'; message: string }
  | {
      state: 'here'
      /** In transient flow the last. */
      field: HeadField
      /** Transient flow: every field with its time, from the initial heads on. Steady flow: empty. */
      fields: readonly TimedField[]
    }

export interface TimedField {
  time: number
  field: HeadField
}

// A run never changes: its heads are fetched once a visit. The oldest of a few goes when another comes.
const kept = new Map<string, Extract<LoadedHeads, { state: 'here' }>>()
const most = 4

/**
 * The head fields of a finished run, in its own unit of length times `factor` (to compare runs of different units);
 * null when `address` is.
 */
export function useHeads(address: string | null, factor = 1): LoadedHeads | null {
  const [loaded, setLoaded] = useState<LoadedHeads>({ state: 'loading' })
  useEffect(() => {
    if (!address) return
    const key = `${address} ${factor}`
    const before = kept.get(key)
    if (before) {
      setLoaded(before)
      return
    }
    const controller = new AbortController()
    setLoaded({ state: 'loading' })
    fetchHeads(address, factor, controller.signal).then(
      (here) => {
        if (kept.size >= most) kept.delete(kept.keys().next().value ?? '')
        kept.set(key, here)
        setLoaded(here)
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

async function fetchHeads(address: string, factor: number, signal: AbortSignal) {
  const answer = await fetch(address, { signal })
  if (!answer.ok) throw new Error(`The server answered ${answer.status} instead of the heads of this run.`)
  const { grid, heads, fields } = decodeHeads(await answer.arrayBuffer())
  const scaled = (own: Float64Array): HeadField => ({
    xEdges: grid.xEdges,
    yEdges: grid.yEdges,
    heads: factor === 1 ? own : own.map((head) => head * factor),
  })
  return {
    state: 'here' as const,
    field: scaled(heads),
    fields: fields.map((one) => ({ time: one.time, field: scaled(one.heads) })),
  }
}
