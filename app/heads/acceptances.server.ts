import { createHash } from 'node:crypto'
import { recordHistory } from '~/projects/history.server'
import type { Warning } from '~/solver/result'
import type { Database } from '~database/connection.server'
import { type Acceptance, acceptanceOf } from './acceptance'
import { findRun, recordHeads } from './runs.server'

export type AcceptAnswer = { ok: true; accepted: number } | { ok: false; message: string }

/** What has been accepted of a run, in the order in which it was; nothing for a run of another project. */
export async function acceptancesOf(db: Database, projectId: number, runId: number): Promise<Acceptance[]> {
  const rows = await db('warning_acceptances')
    .join('runs', 'runs.id', 'warning_acceptances.run_id')
    .join('users', 'users.id', 'warning_acceptances.accepted_by')
    .where({ 'runs.project_id': projectId, 'runs.id': runId })
    .orderBy('warning_acceptances.id')
    .select<(Omit<Acceptance, 'at'> & { at: Date })[]>(
      'code',
      'warning',
      'reason',
      'users.name as by',
      'accepted_at as at',
    )
  return rows.map((row) => ({ ...row, at: row.at.toISOString() }))
}

/**
 * Accepts warnings of a finished run, given by their texts, with one reason. All or none: refused are texts that the
 * run does not say, warnings that nobody can accept, and those accepted already. Section 5 counts as changed: whoever
 * checked it has not seen this.
 */
export async function acceptWarnings(
  db: Database,
  accepted: { projectId: number; runId: number; userId: number; warnings: readonly string[]; reason: string },
): Promise<AcceptAnswer> {
  const { projectId, runId, userId, reason } = accepted
  const run = await findRun(db, projectId, runId)
  if (!run?.result) return { ok: false, message: 'There is no such run with a result.' }
  const said: Warning[] = []
  for (const text of new Set(accepted.warnings)) {
    const warning = run.result.warnings.find((one) => one.text === text)
    if (!warning) return { ok: false, message: `Run ${run.number} does not give this warning: ${text}` }
    if (warning.accept !== true)
      return { ok: false, message: `This warning is not one to be accepted: ${warning.text}` }
    said.push(warning)
  }
  if (said.length === 0) return { ok: false, message: 'Tick the warnings that you accept.' }
  return db.transaction(async (trx): Promise<AcceptAnswer> => {
    // Whoever accepts at the same moment waits here, and then sees what was accepted.
    await trx('runs').where({ id: runId }).forUpdate().first('id')
    const before = await acceptancesOf(trx, projectId, runId)
    for (const warning of said) {
      const earlier = acceptanceOf(warning, before)
      if (earlier) return { ok: false, message: `${earlier.by} has accepted this already: ${warning.text}` }
    }
    for (const { code, text } of said) {
      await trx('warning_acceptances').insert({
        run_id: runId,
        code,
        warning: text,
        warning_sha256: createHash('sha256').update(text).digest('hex'),
        reason,
        accepted_at: new Date(),
        accepted_by: userId,
      })
      await recordHistory(trx, {
        projectId,
        userId,
        section: 'heads',
        action: 'accepted warning',
        subject: `Run ${run.number}, ${run.caseName}: ${code}`,
        after: { warning: text },
        reason,
      })
    }
    await recordHeads(trx, projectId, userId)
    return { ok: true, accepted: said.length }
  })
}
