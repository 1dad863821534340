/** A controlled row as pages and sheets see it. The version is what a save must carry back. */
export interface Row<Body> {
  id: string
  version: number
  kind: string
  position: number
  body: Body
  recordedFrom: string
  recordedBy: string
}

/** What a sheet or a drawing asks for: rows are added, edited or deleted, never overwritten. */
export type RowChange =
  | { op: 'add'; kind: string; id: string; body: unknown }
  | { op: 'edit'; kind: string; id: string; version: number; body: unknown }
  | { op: 'delete'; kind: string; id: string; version: number }

export interface RowProblem {
  id: string
  /** Field of the row, '' for the row as a whole. */
  field: string
  message: string
}

export interface RowConflict {
  id: string
  kind: string
  /** What is in force now; null when somebody deleted the row. */
  theirs: { version: number; body: unknown; by: string; at: string } | null
  yours: unknown
}

/** Answer to a save: all changes or none. */
export type SaveAnswer =
  | { ok: true; rows: { id: string; version: number }[] }
  | { ok: false; problems: RowProblem[]; conflicts: RowConflict[] }
