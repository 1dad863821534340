export type PackageStatus =
  | 'draft'
  | 'shared for check'
  | 'checked'
  | 'approved'
  | 'issued'
  | 'superseded'
  | 'withdrawn'

export interface Signature {
  role: 'originator' | 'checker' | 'approver'
  name: string
  at: string
}

export interface TitleBlockFacts {
  revision: string | null
  status: PackageStatus | null
  signatures: Signature[]
}
