import { z } from 'zod'
import type { PackageStatus, Signature } from './title-block'

/** What each status means, in plain words: for the client's page and the cover. */
export const statusMeaning: Record<PackageStatus, string> = {
  draft: 'being written; not for use',
  'shared for check': 'complete, with the checker; not for use',
  checked: 'checked, waiting for approval; not for use',
  approved: 'approved, waiting to be issued; not for use',
  issued: 'issued for the purpose stated on its cover',
  superseded: 'replaced by a later revision; not for use',
  withdrawn: 'withdrawn; not for use',
}

/** What a signature needs, and what it makes of the package. */
export const statusAfter: Record<Signature['role'], { from: PackageStatus; to: PackageStatus }> = {
  originator: { from: 'draft', to: 'shared for check' },
  checker: { from: 'shared for check', to: 'checked' },
  approver: { from: 'checked', to: 'approved' },
}

/** P01, P02 … A number is never reused. */
export function nextRevision(taken: readonly string[]): string {
  const highest = Math.max(0, ...taken.map((revision) => Number(/^P(\d+)$/.exec(revision)?.[1] ?? 0)))
  return `P${String(highest + 1).padStart(2, '0')}`
}

export const newPackageSchema = z.object({
  runId: z.coerce.number({ error: 'Choose the run.' }).int('Choose the run.').positive('Choose the run.'),
  againstRunId: z.coerce.number().int().positive().optional(),
  fitDate: z.iso.date('Give a date such as 2026-03-14.').optional(),
  purpose: z
    .string({ error: 'Say what the package is issued for.' })
    .trim()
    .min(1, 'Say what the package is issued for.')
    .max(300, 'At most 300 characters.'),
  reason: z
    .string({ error: 'Say what is new in this revision.' })
    .trim()
    .min(1, 'Say what is new in this revision.')
    .max(500, 'At most 500 characters.'),
})
export type NewPackage = z.infer<typeof newPackageSchema>

/** One line of the list of revisions. */
export interface PackageLine {
  id: number
  revision: string
  status: PackageStatus
  purpose: string
  reason: string
  runNumber: number | null
  createdAt: string
  createdBy: string
  issuedAt: string | null
  pdfSha256: string | null
  inputSha256: string | null
  hasPdf: boolean
  /** The PDF is being drawn. */
  drawing: boolean
  signatures: Signature[]
}
