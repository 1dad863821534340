import { z } from 'zod'
import type { Warning } from '~/solver/result'

/** Somebody's word that a run may be issued with this warning. It holds for the warning of this run, as it read then. */
export interface Acceptance {
  code: string
  /** The warning's text, word for word. */
  warning: string
  by: string
  at: string
  reason: string
}

/** A sentence, at the least: shorter than this says nothing that could be checked. */
const shortestReason = 20
const fewestWords = 4

export const acceptanceSchema = z.object({
  runId: z.coerce.number().int().positive(),
  warnings: z.array(z.string()).min(1, 'Tick the warnings that you accept.'),
  reason: z
    .string({ error: 'Say why the result may be used all the same.' })
    .trim()
    .min(shortestReason, 'Say why in a sentence at least: the checker reads it, and it is printed.')
    .max(1000, 'At most 1000 characters.')
    .refine(
      (reason) => reason.split(/\s+/).length >= fewestWords,
      'Say why in a sentence at least: the checker reads it, and it is printed.',
    ),
})

/** Whether an acceptance is of this warning. */
function isOf(acceptance: Pick<Acceptance, 'code' | 'warning'>, warning: Warning): boolean {
  return acceptance.code === warning.code && acceptance.warning === warning.text
}

export function acceptanceOf(warning: Warning, acceptances: readonly Acceptance[]): Acceptance | undefined {
  return acceptances.find((acceptance) => isOf(acceptance, warning))
}

/** Warnings that still keep a result from being issued. */
export function notAccepted(warnings: readonly Warning[], acceptances: readonly Acceptance[]): Warning[] {
  return warnings.filter(
    (warning) => warning.accept === true && acceptanceOf(warning, acceptances) === undefined,
  )
}

/** "accepted by I. Marlowe on 1 Dec 2026: reason", with the day as the site's calendar has it. */
export function acceptanceInWords({ by, at, reason }: Acceptance, day: (iso: string) => string): string {
  return `accepted by ${by} on ${day(at)}: ${reason}`
}
