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
  | {
      op: 'delete'
      kind: string
      id: string
      version: number
      /** The person was told where else the row is used, and wants it gone from there too. */
      alsoElsewhere?: boolean
    }

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

/** Another row that uses this one. */
export interface RowUse {
  /** "case C2 wall to -14" */
  words: string
  /** True where the other row cannot do without: a zone without its material. The deletion is refused. */
  holds: boolean
}

/** Answer to a save: all changes or none. */
export type SaveAnswer =
  | { ok: true; rows: { id: string; version: number }[] }
  | { ok: false; problems: RowProblem[]; conflicts: RowConflict[] }
