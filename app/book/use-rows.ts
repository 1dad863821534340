import { useCallback, useEffect, useMemo, useRef, useState, useSyncExternalStore } from 'react'
import { useRevalidator } from 'react-router'
import type { ZodType } from 'zod'
import type { SheetEdit, SheetEdits, SheetRow } from '~/components/sheet'
import type { CellInput } from '~/components/sheet-cells'
import type { Row, RowChange, SaveAnswer } from './row'
import {
  type Body,
  createRowsStore,
  type DraftConflict,
  type DraftRow,
  type RowEdit,
  type Saving,
  type Sent,
} from './rows-store'

export interface UseRowsOptions {
  projectId: number
  /** Drafts that wait in this browser belong to one person. */
  userId: number
  /** Schema of each kind of row on the page. */
  schemas: Readonly<Record<string, ZodType>>
  /** False for a role that may only look: sheets come without edits. */
  editable: boolean
}

/** The rows of a page, ready for its sheets, forms and drawing. */
export interface RowsEditor {
  editable: boolean
  saving: Saving
  unsaved: boolean
  conflicts: readonly DraftConflict[]
  /** Drafts of one kind, in the order of the sheet. */
  rows: (kind: string) => readonly DraftRow[]
  /**
   * Rows of one kind whose body the schema takes, for drawings and totals: shown as typed, a moment before they are
   * saved. A row that cannot be read yet is left out.
   */
  sound: <B>(kind: string) => Row<B>[]
  /**
   * Rows of one kind whose place the schema takes, for a drawing: a well without its rate is drawn all the same. Other
   * fields may be missing; the name is never.
   */
  placed: <B>(kind: string, place: ZodType) => Row<B>[]
  /** Props of a Sheet. */
  sheet: (kind: string) => { rows: readonly SheetRow[]; edits: SheetEdits | undefined }
  /** One gesture, undone as a whole: what a drawing calls when a vertex was dragged. */
  apply: (edits: RowEdit[]) => void
  /** Sets fields of a row. */
  set: (id: string, values: Body) => void
  undo: () => void
  redo: () => void
  retry: () => void
  resolve: (id: string, body: Body | null) => void
}

async function sendRows(projectId: number, changes: RowChange[]): Promise<Sent> {
  let response: Response
  try {
    response = await fetch(`/projects/${projectId}/rows`, {
      method: 'POST',
      headers: { 'Content-Type': 'application/json', Accept: 'application/json' },
      body: JSON.stringify({ changes }),
      redirect: 'manual',
    })
  } catch (error) {
    if (error instanceof TypeError) return { kind: 'unreachable' }
    throw error
  }
  if (response.status === 200 || response.status === 400 || response.status === 409) {
    const answer = (await response.json()) as SaveAnswer | { error: string }
    return 'ok' in answer ? { kind: 'answer', answer } : { kind: 'refused', message: answer.error }
  }
  if (response.type === 'opaqueredirect' || response.status === 401) {
    return { kind: 'refused', message: 'you are signed out. Sign in in another tab, then try again' }
  }
  if (response.status === 403) return { kind: 'refused', message: await refusal(response) }
  if (response.status === 404) return { kind: 'refused', message: 'this project is no longer yours to edit' }
  if (response.status === 413) return { kind: 'refused', message: 'this is too much for one save' }
  return { kind: 'unreachable' }
}

async function refusal(response: Response): Promise<string> {
  const text = await response.text()
  try {
    return (JSON.parse(text) as { error?: string }).error ?? text
  } catch (error) {
    if (error instanceof SyntaxError) return text
    throw error
  }
}

/** The store saves after the page is gone, too; a page that comes back to the same rows finds it at work. */
function shelfFor(key: string) {
  return {
    read: () => sessionStorage.getItem(key),
    write(text: string | null) {
      if (text === null) sessionStorage.removeItem(key)
      else {
        try {
          sessionStorage.setItem(key, text)
        } catch (error) {
          // A full or forbidden store: the drafts stay on the page, which still warns before it is left.
          if (!(error instanceof DOMException)) throw error
        }
      }
    },
  }
}

/**
 * Rows of a page with drafts, undo and saving by itself. `initial` is what the loader read; when the loader reads
 * again, drafts stay on top. Use one hook a page, over all kinds on it, so that undo follows the person's own order.
 */
export function useRows(initial: readonly Row<unknown>[], options: UseRowsOptions): RowsEditor {
  const { projectId, userId, schemas, editable } = options
  const revalidator = useRevalidator()
  const revalidate = useRef(revalidator.revalidate)
  revalidate.current = revalidator.revalidate
  const mounted = useRef(false)

  const [store] = useState(() =>
    createRowsStore({
      rows: initial,
      schemas,
      send: (changes) => sendRows(projectId, changes),
      onAnswer: () => {
        if (mounted.current) revalidate.current()
      },
      shelf:
        typeof sessionStorage === 'undefined'
          ? undefined
          : shelfFor(`lavant:${userId}:${projectId}:${Object.keys(schemas).sort().join('+')}`),
    }),
  )
  const snapshot = useSyncExternalStore(store.subscribe, store.snapshot, store.snapshot)

  const seen = useRef(initial)
  useEffect(() => {
    if (seen.current === initial) return
    seen.current = initial
    store.refresh(initial)
  }, [store, initial])

  useEffect(() => {
    mounted.current = true
    if (editable) store.restore()
    return () => {
      mounted.current = false
      // Leaving within the application: what is ready goes now, what is not waits on the shelf.
      if (editable) void store.save()
    }
  }, [store, editable])

  useEffect(() => {
    if (!snapshot.unsaved) return
    function warn(event: BeforeUnloadEvent) {
      event.preventDefault()
    }
    window.addEventListener('beforeunload', warn)
    return () => window.removeEventListener('beforeunload', warn)
  }, [snapshot.unsaved])

  const set = useCallback(
    (id: string, values: Body) => {
      const cells: Record<string, CellInput> = Object.fromEntries(
        Object.entries(values).map(([field, value]) => [field, { ok: true, value }]),
      )
      store.apply([{ op: 'set', id, cells }])
    },
    [store],
  )

  return useMemo(() => {
    function rows(kind: string) {
      return snapshot.rows.filter((row) => row.kind === kind)
    }
    function read<B>(kind: string, schema: ZodType | undefined, whole: boolean): Row<B>[] {
      return rows(kind).flatMap(({ id, version, body, recordedBy, recordedFrom }, position) => {
        const found = schema?.safeParse(body)
        if (!found?.success) return []
        const shown = whole ? found.data : { name: '', ...body }
        return [{ id, kind, version, position, body: shown as B, recordedBy, recordedFrom }]
      })
    }
    return {
      editable,
      saving: snapshot.saving,
      unsaved: snapshot.unsaved,
      conflicts: snapshot.conflicts,
      rows,
      sound: <B>(kind: string) => read<B>(kind, schemas[kind], true),
      placed: <B>(kind: string, place: ZodType) => read<B>(kind, place, false),
      sheet(kind: string) {
        const edits = {
          apply: (changes: SheetEdit[]) =>
            store.apply(changes.map((edit) => (edit.op === 'add' ? { ...edit, kind } : edit))),
          undo: store.undo,
          redo: store.redo,
          canUndo: snapshot.canUndo,
          canRedo: snapshot.canRedo,
        }
        return { rows: rows(kind), edits: editable ? edits : undefined }
      },
      apply: store.apply,
      set,
      undo: store.undo,
      redo: store.redo,
      retry: () => void store.save(),
      resolve: store.resolve,
    }
  }, [snapshot, store, schemas, editable, set])
}
