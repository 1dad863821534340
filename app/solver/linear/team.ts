import { conjugateGradients, type Decision } from './conjugate-gradients'
import { cycleOf } from './cycle'
import type { KernelExports } from './kernels'
import type { Plan } from './plan'

/**
 * Two threads on one memory. Both run the same program, each on its part of the rows, and meet where one needs what the
 * other has done. A meeting is waited for by looking (briefly), then asleep, then not at all: a thread that does not
 * come is done without, whatever has become of it.
 */

/** A thread that waits for tasks; whoever makes Kernels for two threads starts it. */
export interface SecondThread {
  post: (task: SharedTask) => void
}

export interface SharedTask {
  module: WebAssembly.Module
  memory: WebAssembly.Memory
  plan: Plan
  target: number
  mostIterations: number
  /** Which solve this is: the offer is void once the number has changed. */
  turn: number
}

/** Places in the counters (Int32). */
const offer = 0
const decided = 1
const firstArrival = 2
const firstSleeper = 4
const places = 8

/** Looks at a counter before going to sleep: about a tenth of a millisecond. */
const looks = 50_000
/** Milliseconds after which a thread that does not come is done without. */
const patience = 2000

/** The other thread did not come. */
export class Alone extends Error {}

export interface Meeting {
  /** Returns when the other thread has come to the same meeting; throws Alone when it does not. */
  meet: () => void
  /** Milliseconds asleep so far. */
  waited: number
}

export function countersOf(memory: WebAssembly.Memory, plan: Plan): Int32Array {
  return new Int32Array(memory.buffer, plan.waits, places)
}

/** Meetings of thread `index`, 0 or 1, with the other one. */
export function meetings(counters: Int32Array, index: number): Meeting {
  const own = firstArrival + index
  const other = firstArrival + 1 - index
  const sleeper = firstSleeper + index
  let count = 0
  const meeting: Meeting = {
    waited: 0,
    meet() {
      count++
      Atomics.store(counters, own, count)
      if (Atomics.load(counters, firstSleeper + 1 - index) === 1) Atomics.notify(counters, own)
      for (let k = 0; k < looks; k++) if (Atomics.load(counters, other) >= count) return
      const started = performance.now()
      Atomics.store(counters, sleeper, 1)
      for (;;) {
        const seen = Atomics.load(counters, other)
        if (seen >= count) break
        const left = patience - (performance.now() - started)
        if (left <= 0) throw new Alone('The other thread did not come.')
        Atomics.wait(counters, other, seen, left)
      }
      Atomics.store(counters, sleeper, 0)
      meeting.waited += performance.now() - started
    },
  }
  return meeting
}

/** Offers a solve to the second thread; false while it is not through with the last one. */
export function offerTurn(counters: Int32Array, turn: number): boolean {
  if (Atomics.load(counters, offer) !== 0) return false
  for (let place = decided; place < places; place++) Atomics.store(counters, place, 0)
  Atomics.store(counters, offer, turn)
  return true
}

/** Has the second thread taken the offer? Waits a millisecond or two; after false it never will. */
export function isTaken(counters: Int32Array, turn: number): boolean {
  const end = performance.now() + 2
  while (performance.now() < end) if (Atomics.load(counters, offer) === -turn) return true
  return Atomics.compareExchange(counters, offer, turn, 0) === -turn
}

/** How long a second thread that kept others waiting is left alone: so many solves, twice as many every time, up to a bound. */
interface Rest {
  solves: number
  next: number
}
const longestRest = 128
const rests = new WeakMap<SecondThread, Rest>()

/** Is it worth asking this thread now? Counts the solves it is left alone for. */
export function mayAsk(second: SecondThread): boolean {
  const rest = rests.get(second)
  if (!rest || rest.solves === 0) return true
  rest.solves--
  return false
}

/** What came of asking. */
export function asked(second: SecondThread, wasHelp: boolean): void {
  if (wasHelp) {
    rests.delete(second)
    return
  }
  const next = rests.get(second)?.next ?? 1
  rests.set(second, { solves: next, next: Math.min(longestRest, 2 * next) })
}

const decisions: Decision[] = ['go on', 'cancel', 'part']

/** The first thread says how both go on. */
export function decideTogether(counters: Int32Array, { meet }: Meeting, decision: Decision): Decision {
  Atomics.store(counters, decided, decisions.indexOf(decision))
  meet()
  return decision
}

const instances = new WeakMap<WebAssembly.Memory, KernelExports>()

function kernelsOn(module: WebAssembly.Module, memory: WebAssembly.Memory): KernelExports {
  const known = instances.get(memory)
  if (known) return known
  const kernels = new WebAssembly.Instance(module, { env: { memory } }).exports as unknown as KernelExports
  instances.set(memory, kernels)
  return kernels
}

/** What the second thread does with a task: its part of the solve, or nothing when the offer is void. */
export function help({ module, memory, plan, target, mostIterations, turn }: SharedTask): void {
  const counters = countersOf(memory, plan)
  if (Atomics.compareExchange(counters, offer, turn, -turn) !== turn) return
  const { meet } = meetings(counters, 1)
  try {
    const doubles = new Float64Array(memory.buffer)
    const cycle = cycleOf(plan, kernelsOn(module, memory), doubles, { index: 1, count: 2, meet })
    conjugateGradients(
      cycle,
      { target, mostIterations },
      {
        layOut: meet,
        largest: () => 0,
        decide() {
          meet()
          return decisions[Atomics.load(counters, decided)] ?? 'cancel'
        },
        alone: () => null,
      },
    )
  } catch (error) {
    if (!(error instanceof Alone)) throw error
  } finally {
    Atomics.store(counters, offer, 0)
  }
}
