import type { ZodType } from 'zod'
import type { CellInput } from '~/components/sheet-cells'
import type { Row, RowChange, RowConflict, RowProblem, SaveAnswer } from './row'

/** A row as the person on this page has it: what is in force, with their own changes on top. */
export interface DraftRow {
  id: string
  kind: string
  /** Version in force that the draft builds on; 0 for a row that is not saved yet. */
  version: number
  body: Body
  typed: Readonly<Record<string, { text: string; message: string }>>
  problems: readonly RowProblem[]
  state: 'saved' | 'unsaved' | 'conflict'
  /** Who recorded the version in force, and when; '' for a row that is not saved yet. */
  recordedBy: string
  recordedFrom: string
}

export type Body = Record<string, unknown>

export type RowEdit =
  /** `typing` marks keystrokes in a form: a run of them in one field is undone together. */
  | { op: 'set'; id: string; cells: Record<string, CellInput>; typing?: boolean }
  | { op: 'add'; id: string; kind: string; body: Body; cells: Record<string, CellInput> }
  | { op: 'delete'; id: string; alsoElsewhere?: boolean }

/** Where the saving stands. `attention` counts cells that must be put right before their rows can be saved. */
export type Saving =
  | { state: 'saved'; at: Date | null }
  | { state: 'saving' }
  | { state: 'attention'; count: number }
  | { state: 'conflict'; count: number }
  | { state: 'failed'; message: string; retries: boolean }

export interface RowsSnapshot {
  rows: readonly DraftRow[]
  saving: Saving
  conflicts: readonly DraftConflict[]
  /** Something here is not in the book yet. */
  unsaved: boolean
  canUndo: boolean
  canRedo: boolean
}

/** Two people changed the same row: what it was, what is in force now, and what this person has. */
export interface DraftConflict {
  id: string
  kind: string
  base: Body | null
  theirs: { version: number; body: Body; by: string; at: string } | null
  mine: Body | null
}

/** Answer to a save as the page's transport saw it. */
export type Sent =
  | { kind: 'answer'; answer: SaveAnswer }
  /** Signed out, no permission, too much: sending it again alone will not help. */
  | { kind: 'refused'; message: string }
  | { kind: 'unreachable' }

export interface RowsStoreOptions {
  rows: readonly Row<unknown>[]
  /** Schema of each kind of row that this page edits. */
  schemas: Readonly<Record<string, ZodType>>
  send: (changes: RowChange[]) => Promise<Sent>
  /** After each answer: the page reads again what changed around the rows. */
  onAnswer?: () => void
  /** Where drafts wait out a reload or an expired session; null without one. */
  shelf?: { read: () => string | null; write: (text: string | null) => void }
  saveAfterMilliseconds?: number
}

interface Draft {
  id: string
  kind: string
  body: Body
  typed: DraftRow['typed']
  /** What the server refused of this very body. */
  refused?: RowProblem[]
}

interface Base {
  kind: string
  version: number
  body: Body
  recordedBy?: string
  recordedFrom?: string
}

type Cell = { value: unknown } | { text: string; message: string }

type Step =
  | { op: 'set'; id: string; before: Record<string, Cell>; after: Record<string, Cell> }
  | { op: 'add' | 'delete'; draft: Draft; index: number }

/** At most this many changes go in one request, so that a large paste stays under the server's limit. */
const batchSize = 300
const retryMilliseconds = [2_000, 5_000, 15_000, 30_000]

export interface RowsStore {
  subscribe: (listener: () => void) => () => void
  snapshot: () => RowsSnapshot
  /** One gesture of a person: undone as a whole. */
  apply: (edits: RowEdit[]) => void
  undo: () => void
  redo: () => void
  /** Sends what is ready now. */
  save: () => Promise<void>
  /** What the loader read again; drafts stay on top of it. */
  refresh: (rows: readonly Row<unknown>[]) => void
  /** Takes back drafts that waited on the shelf. */
  restore: () => void
  /** Ends a conflict with the body the person chose; null means the row goes. */
  resolve: (id: string, body: Body | null) => void
}

/** Equal in every value; a field that is missing counts as null, as the schemas' defaults have it. */
export function sameBody(a: unknown, b: unknown): boolean {
  if (a === b) return true
  if (a === null || a === undefined) return b === null || b === undefined
  if (typeof a !== 'object' || typeof b !== 'object' || b === null) return false
  const [left, right] = [a as Body, b as Body]
  return [...new Set([...Object.keys(left), ...Object.keys(right)])].every((key) =>
    sameBody(left[key], right[key]),
  )
}

/**
 * The rows of one page while somebody edits them: drafts over what is in force, undo and redo of this person's own
 * changes, saving by itself a moment after the last keystroke, and nothing lost when a save comes to nothing.
 */
export function createRowsStore(options: RowsStoreOptions): RowsStore {
  const { schemas, send, shelf, saveAfterMilliseconds = 700 } = options
  const base = new Map<string, Base>()
  let drafts: Draft[] = []
  const conflicts = new Map<string, DraftConflict>()
  /** Deleted rows that the person wants gone from everywhere they are used. */
  const everywhere = new Set<string>()
  let undoSteps: Step[][] = []
  let redoSteps: Step[][] = []
  const listeners = new Set<() => void>()
  const checked = new WeakMap<Body, RowProblem[]>()
  let sending = false
  let failed: { message: string; retries: boolean } | null = null
  let failures = 0
  let savedAt: Date | null = null
  let timer: ReturnType<typeof setTimeout> | undefined

  take(options.rows)
  let current = look()

  function take(rows: readonly Row<unknown>[]) {
    for (const row of rows) {
      base.set(row.id, baseOf(row, row.body as Body))
      drafts.push({ id: row.id, kind: row.kind, body: row.body as Body, typed: {} })
    }
  }

  function baseOf({ kind, version, recordedBy, recordedFrom }: Row<unknown>, body: Body): Base {
    return { kind, version, body, recordedBy, recordedFrom }
  }

  function problemsOf(draft: Draft): RowProblem[] {
    let problems = checked.get(draft.body)
    if (!problems) {
      const result = schemas[draft.kind]?.safeParse(draft.body)
      problems =
        result && !result.success
          ? result.error.issues.map((issue) => ({
              id: draft.id,
              field: issue.path.join('.'),
              message: issue.message,
            }))
          : []
      checked.set(draft.body, problems)
    }
    // A cell that could not be read says so itself; the row's rule would only repeat it.
    const own = problems.filter(({ field }) => !((field.split('.')[0] as string) in draft.typed))
    return draft.refused ? [...own, ...draft.refused] : own
  }

  function isChanged(draft: Draft): boolean {
    const known = base.get(draft.id)
    return !known || Object.keys(draft.typed).length > 0 || !sameBody(known.body, draft.body)
  }

  function removed(): [string, Base][] {
    const present = new Set(drafts.map((draft) => draft.id))
    return [...base].filter(([id]) => !present.has(id))
  }

  function look(): RowsSnapshot {
    let attention = 0
    const rows = drafts.map((draft): DraftRow => {
      const problems = problemsOf(draft)
      const changed = isChanged(draft)
      if (changed) attention += problems.length + Object.keys(draft.typed).length
      return {
        id: draft.id,
        kind: draft.kind,
        version: base.get(draft.id)?.version ?? 0,
        body: draft.body,
        typed: draft.typed,
        problems,
        state: conflicts.has(draft.id) ? 'conflict' : changed ? 'unsaved' : 'saved',
        recordedBy: base.get(draft.id)?.recordedBy ?? '',
        recordedFrom: base.get(draft.id)?.recordedFrom ?? '',
      }
    })
    const unsaved = rows.some((row) => row.state !== 'saved') || removed().length > 0
    const waiting = sending || (unsaved && ready().length > 0)
    const saving: Saving = failed
      ? { state: 'failed', ...failed }
      : conflicts.size > 0
        ? { state: 'conflict', count: conflicts.size }
        : waiting
          ? { state: 'saving' }
          : attention > 0
            ? { state: 'attention', count: attention }
            : { state: 'saved', at: savedAt }
    return {
      rows,
      saving,
      // What the person has now: they may have gone on editing the row since the save was refused.
      conflicts: [...conflicts.values()].map((conflict) => ({
        ...conflict,
        mine: drafts.find((draft) => draft.id === conflict.id)?.body ?? null,
      })),
      unsaved,
      canUndo: undoSteps.length > 0,
      canRedo: redoSteps.length > 0,
    }
  }

  function tell() {
    shelve()
    current = look()
    for (const listener of listeners) listener()
  }

  /** Changes that can be sent: whole rows without a problem and not in conflict. */
  function ready(): RowChange[] {
    const changes: RowChange[] = []
    for (const [id, known] of removed()) {
      if (conflicts.has(id)) continue
      const { kind, version } = known
      const change = { op: 'delete', kind, id, version } as const
      changes.push(everywhere.has(id) ? { ...change, alsoElsewhere: true } : change)
    }
    for (const draft of drafts) {
      if (conflicts.has(draft.id) || !isChanged(draft)) continue
      if (Object.keys(draft.typed).length > 0 || problemsOf(draft).length > 0) continue
      const known = base.get(draft.id)
      const { id, kind, body } = draft
      changes.push(
        known ? { op: 'edit', kind, id, version: known.version, body } : { op: 'add', kind, id, body },
      )
    }
    return changes
  }

  function schedule(after = saveAfterMilliseconds) {
    clearTimeout(timer)
    timer = setTimeout(save, after)
  }

  async function save(): Promise<void> {
    clearTimeout(timer)
    if (sending) return
    const batch = ready().slice(0, batchSize)
    if (batch.length === 0) {
      failed = null
      tell()
      return
    }
    sending = true
    tell()
    const sent = await send(batch)
    sending = false
    if (sent.kind === 'answer') {
      failed = null
      failures = 0
      if (sent.answer.ok) accept(batch, sent.answer.rows)
      else refuse(batch, sent.answer.problems, sent.answer.conflicts)
      if (ready().length > 0) schedule(0)
    } else if (sent.kind === 'refused') {
      failed = { message: sent.message, retries: false }
    } else {
      failed = { message: 'no connection to the server', retries: true }
      schedule(retryMilliseconds[Math.min(failures, retryMilliseconds.length - 1)])
      failures += 1
    }
    tell()
    if (sent.kind === 'answer') options.onAnswer?.()
  }

  function accept(batch: RowChange[], saved: { id: string; version: number }[]) {
    const versions = new Map(saved.map((row) => [row.id, row.version]))
    savedAt = new Date()
    for (const change of batch) {
      const version = versions.get(change.id)
      if (change.op === 'delete') base.delete(change.id)
      else if (version !== undefined) {
        base.set(change.id, { kind: change.kind, version, body: change.body as Body })
      }
    }
  }

  function refuse(batch: RowChange[], problems: RowProblem[], found: RowConflict[]) {
    for (const conflict of found) {
      const theirs = conflict.theirs && { ...conflict.theirs, body: conflict.theirs.body as Body }
      const draft = drafts.find((one) => one.id === conflict.id)
      const mine = draft?.body ?? null
      if (theirs ? mine !== null && sameBody(theirs.body, mine) : mine === null) {
        // Both came to the same end: an earlier save whose answer never arrived, usually.
        if (theirs) base.set(conflict.id, { kind: conflict.kind, version: theirs.version, body: theirs.body })
        else base.delete(conflict.id)
      } else {
        const before = base.get(conflict.id)?.body ?? null
        conflicts.set(conflict.id, { id: conflict.id, kind: conflict.kind, base: before, theirs, mine })
      }
    }
    const refusedIds = new Set(problems.map((problem) => problem.id))
    drafts = drafts.map((draft) =>
      refusedIds.has(draft.id)
        ? { ...draft, refused: problems.filter((problem) => problem.id === draft.id) }
        : draft,
    )
    for (const change of batch) {
      // A deletion that was refused comes back with its reason, since there is no cell left to carry it.
      if (change.op !== 'delete' || !refusedIds.has(change.id)) continue
      const known = base.get(change.id)
      if (!known) continue
      drafts.push({
        id: change.id,
        kind: known.kind,
        body: known.body,
        typed: {},
        refused: problems.filter((problem) => problem.id === change.id),
      })
    }
  }

  function cellOf(draft: Draft, field: string): Cell {
    return draft.typed[field] ?? { value: draft.body[field] }
  }

  function withCells(draft: Draft, cells: Record<string, Cell>): Draft {
    const body = { ...draft.body }
    const typed = { ...draft.typed }
    for (const [field, cell] of Object.entries(cells)) {
      delete typed[field]
      if ('value' in cell) body[field] = cell.value
      else typed[field] = { text: cell.text, message: cell.message }
    }
    return { id: draft.id, kind: draft.kind, body, typed }
  }

  function asCells(inputs: Record<string, CellInput>): Record<string, Cell> {
    return Object.fromEntries(
      Object.entries(inputs).map(([field, input]) => [
        field,
        input.ok ? { value: input.value } : { text: input.text, message: input.message },
      ]),
    )
  }

  function apply(edits: RowEdit[]) {
    const steps: Step[] = []
    for (const edit of edits) {
      const index = drafts.findIndex((draft) => draft.id === edit.id)
      const draft = drafts[index]
      if (edit.op === 'add') {
        const added = withCells(
          { id: edit.id, kind: edit.kind, body: edit.body, typed: {} },
          asCells(edit.cells),
        )
        drafts = [...drafts, added]
        steps.push({ op: 'add', draft: added, index: drafts.length - 1 })
      } else if (draft && edit.op === 'delete') {
        drafts = drafts.filter((one) => one !== draft)
        if (edit.alsoElsewhere) everywhere.add(edit.id)
        steps.push({ op: 'delete', draft, index })
      } else if (draft && edit.op === 'set') {
        const after = Object.fromEntries(
          Object.entries(asCells(edit.cells)).filter(
            ([field, cell]) => !sameBody(cellOf(draft, field), cell),
          ),
        )
        if (Object.keys(after).length === 0) continue
        const before = Object.fromEntries(Object.keys(after).map((field) => [field, cellOf(draft, field)]))
        drafts = drafts.map((one) => (one === draft ? withCells(draft, after) : one))
        steps.push({ op: 'set', id: draft.id, before, after })
      }
    }
    if (steps.length === 0) return
    const [edit] = edits
    const joined = edit?.op === 'set' && edit.typing ? joinTyping(undoSteps.at(-1), steps) : null
    undoSteps = joined ? [...undoSteps.slice(0, -1), joined] : [...undoSteps, steps].slice(-200)
    redoSteps = []
    tell()
    schedule()
  }

  function put(draft: Draft, index: number) {
    if (drafts.some((one) => one.id === draft.id)) return
    drafts = [...drafts.slice(0, index), { ...draft, refused: undefined }, ...drafts.slice(index)]
  }

  function replay(steps: Step[], direction: 'back' | 'forth') {
    for (const step of direction === 'back' ? [...steps].reverse() : steps) {
      if (step.op === 'set') {
        const cells = direction === 'back' ? step.before : step.after
        drafts = drafts.map((draft) => (draft.id === step.id ? withCells(draft, cells) : draft))
      } else if ((step.op === 'add') === (direction === 'back')) {
        drafts = drafts.filter((draft) => draft.id !== step.draft.id)
      } else {
        put(step.draft, step.index)
      }
    }
    tell()
    schedule()
  }

  function undo() {
    const steps = undoSteps.at(-1)
    if (!steps) return
    undoSteps = undoSteps.slice(0, -1)
    redoSteps = [...redoSteps, steps]
    replay(steps, 'back')
  }

  function redo() {
    const steps = redoSteps.at(-1)
    if (!steps) return
    redoSteps = redoSteps.slice(0, -1)
    undoSteps = [...undoSteps, steps]
    replay(steps, 'forth')
  }

  function refresh(rows: readonly Row<unknown>[]) {
    // While a save is under way the page may have read either side of it; it reads again when the save is done.
    if (sending) return
    const theirs = new Map(rows.map((row) => [row.id, row]))
    const mine = new Map(drafts.map((draft) => [draft.id, draft]))
    const gone = new Set(removed().map(([id]) => id))
    const next: Draft[] = []
    for (const row of rows) {
      const draft = mine.get(row.id)
      const isMine = draft ? isChanged(draft) : gone.has(row.id)
      if (draft && isMine) next.push(draft)
      if (isMine) continue
      // An unchanged row keeps its body object, so that it is neither checked nor drawn again.
      const known = base.get(row.id)
      const body =
        draft && known?.version === row.version && sameBody(known.body, row.body)
          ? draft.body
          : (row.body as Body)
      base.set(row.id, baseOf(row, body))
      next.push({ id: row.id, kind: row.kind, body, typed: {} })
    }
    for (const draft of drafts) {
      if (theirs.has(draft.id)) continue
      if (isChanged(draft)) next.push(draft)
      else base.delete(draft.id)
    }
    for (const [id] of gone.size > 0 ? removed() : []) {
      if (!theirs.has(id) && gone.has(id)) base.delete(id)
    }
    drafts = next
    tell()
  }

  /** What is not in the book yet, as text for the shelf. */
  function shelve() {
    if (!shelf) return
    const changed = drafts.filter(isChanged).map(({ id, kind, body, typed }) => {
      const known = base.get(id)
      return { id, kind, body, typed, base: known ? { version: known.version, body: known.body } : null }
    })
    const deleted = removed().map(([id, known]) => ({ id, kind: known.kind, version: known.version }))
    const nothing = changed.length === 0 && deleted.length === 0
    shelf.write(nothing ? null : JSON.stringify({ changed, deleted }))
  }

  function restore() {
    const text = shelf?.read()
    if (!text) return
    let kept: Shelved
    try {
      kept = JSON.parse(text) as Shelved
    } catch (error) {
      if (error instanceof SyntaxError) return
      throw error
    }
    for (const { id, kind, body, typed, base: built } of kept.changed) {
      const known = base.get(id)
      if (known && sameBody(known.body, body) && Object.keys(typed).length === 0) continue
      // Building on an older version on purpose: the save then answers with both values.
      if (built) base.set(id, { kind, version: built.version, body: built.body })
      const draft = { id, kind, body, typed }
      drafts = drafts.some((one) => one.id === id)
        ? drafts.map((one) => (one.id === id ? draft : one))
        : [...drafts, draft]
    }
    for (const { id, kind, version } of kept.deleted) {
      const known = base.get(id)
      if (!known) continue
      base.set(id, { kind, version, body: known.body })
      drafts = drafts.filter((draft) => draft.id !== id)
    }
    tell()
    schedule()
  }

  function resolve(id: string, body: Body | null) {
    const conflict = conflicts.get(id)
    if (!conflict) return
    conflicts.delete(id)
    const { theirs, kind } = conflict
    if (theirs) base.set(id, { kind, version: theirs.version, body: theirs.body })
    else base.delete(id)
    // A cell that could not be read yet goes on waiting, unless the person lets go of their side altogether.
    const typed = (body !== theirs?.body && drafts.find((one) => one.id === id)?.typed) || {}
    const draft = body && { id, kind, body, typed }
    if (!draft) drafts = drafts.filter((one) => one.id !== id)
    else if (drafts.some((one) => one.id === id)) drafts = drafts.map((one) => (one.id === id ? draft : one))
    else drafts = [...drafts, draft]
    tell()
    schedule(0)
  }

  return {
    subscribe(listener) {
      listeners.add(listener)
      return () => listeners.delete(listener)
    },
    snapshot: () => current,
    apply,
    undo,
    redo,
    save,
    refresh,
    restore,
    resolve,
  }
}

/** Both steps as one where they are keystrokes in the same field of the same row. */
function joinTyping(before: Step[] | undefined, after: Step[]): Step[] | null {
  const [first, ...more] = before ?? []
  const [last, ...others] = after
  if (first?.op !== 'set' || last?.op !== 'set' || more.length > 0 || others.length > 0) return null
  const same = first.id === last.id && Object.keys(first.after).join() === Object.keys(last.after).join()
  return same ? [{ ...first, after: last.after }] : null
}

interface Shelved {
  changed: {
    id: string
    kind: string
    body: Body
    typed: DraftRow['typed']
    base: { version: number; body: Body } | null
  }[]
  deleted: { id: string; kind: string; version: number }[]
}
