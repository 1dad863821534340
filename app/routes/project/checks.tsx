import { CheckButton } from '~/book/check-button'
import { ConflictPanel } from '~/book/conflict-panel'
import { referenceLines } from '~/book/references'
import { listRows } from '~/book/rows.server'
import { SaveState } from '~/book/save-state'
import { sectionStatus } from '~/book/sections.server'
import { useRows } from '~/book/use-rows'
import type { Estimate } from '~/checks/estimate'
import { checkColumns, checkSchemas, EstimateSheet } from '~/checks/estimate-sheet'
import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { Caution } from '~/components/notice'
import { Heading, SectionPage } from '~/components/section-page'
import { acceptancesOf } from '~/heads/acceptances.server'
import { mostBalanceError } from '~/heads/account'
import { resultAt } from '~/heads/moment'
import { RunWarnings } from '~/heads/run-warnings'
import { latestDoneRun } from '~/heads/runs.server'
import { verificationLines } from '~/heads/verification'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { formatNumber, shownUnit, unitLabel } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/checks'

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const [rows, status, run] = await Promise.all([
    listRows(db, project.id, 'estimate'),
    sectionStatus(db, project.id, 'checks'),
    latestDoneRun(db, project.id),
  ])
  const result = run?.result && resultAt(run.result)
  return {
    project,
    member: { userId: member.userId, mayEdit: can(member, 'edit', 'checks') },
    mayCheck: can(member, 'check', 'section'),
    status,
    rows,
    run:
      run && result
        ? {
            id: run.id,
            number: run.number,
            caseName: run.caseName,
            converged: result.converged,
            residual: result.residual,
            tolerance: run.model.solver?.tolerance ?? null,
            headError: result.headError,
            errorPercent: result.balance.errorPercent[0] ?? null,
            inflow: result.balance.inflow[0] ?? null,
            outflow: result.balance.outflow[0] ?? null,
            abstraction: result.wells.reduce((sum, well) => sum + (well.achieved[0] ?? 0), 0),
            warnings: result.warnings,
            acceptances: await acceptancesOf(db, project.id, run.id),
            verification: verificationLines(result, unitLabel(run.model.units.length)),
          }
        : null,
  }
}

export default function ChecksPage({ loaderData }: Route.ComponentProps) {
  const { project, member, mayCheck, status, rows, run } = loaderData
  const { units } = project
  const book = useRows(rows, {
    projectId: project.id,
    userId: member.userId,
    schemas: checkSchemas,
    editable: member.mayEdit,
  })
  const estimates = book.sound<Estimate>('estimate')
  const rate = unitLabel(shownUnit('rate', units))
  const ratios = estimates.flatMap(({ body }) =>
    body.computed === null || body.value === 0
      ? []
      : [{ name: body.result, ratio: body.computed / body.value }],
  )
  const balanced = run !== null && run.errorPercent !== null && Math.abs(run.errorPercent) <= mostBalanceError
  return (
    <SectionPage
      number={8}
      title="Checks"
      actions={
        <>
          <SaveState book={book} />
          <CheckButton
            projectId={project.id}
            timeZone={project.timeZone}
            status={status}
            mayCheck={mayCheck}
          />
        </>
      }
      references={referenceLines(
        '8.1',
        estimates.map(({ body, recordedFrom }) => ({ name: body.result, source: body.source, recordedFrom })),
        status.checkedAt,
      )}
      carried={[
        ...ratios.map(({ name, ratio }) => ({
          label: `${name}: computed / estimate`,
          value: formatNumber(ratio, 2),
          note:
            ratio > 2 || ratio < 0.5 ? 'more than a factor of two apart: say why' : 'within a factor of two',
          state: ratio > 2 || ratio < 0.5 ? ('warn' as const) : ('good' as const),
        })),
        ...(run
          ? [
              {
                label: 'Water-balance error',
                value: formatNumber(run.errorPercent),
                unit: '%',
                note: balanced
                  ? `run ${run.number}, within ${mostBalanceError} %`
                  : `above ${mostBalanceError} %: no result`,
                state: balanced ? ('good' as const) : ('alarm' as const),
              },
            ]
          : []),
      ]}
      carryFoot={<Caution />}
    >
      <ConflictPanel book={book} units={units} columns={checkColumns} />
      <Heading no="8.1">Independent estimates</Heading>
      <p className="mb-2 text-flint-2">
        A result is worth as much as the estimate that could have contradicted it: one by hand or by formula
        for each main result, with its source.
      </p>
      <EstimateSheet book={book} units={units} />

      <Heading no="8.2">What the run says of itself</Heading>
      {run ? (
        <>
          <DataTable
            caption={`Record of run ${run.number}`}
            rows={[
              {
                what: 'Outcome',
                value: run.converged ? 'converged' : 'did not converge: not to be used',
                limit: 'converged',
              },
              {
                what: 'Residual relative to the right-hand side',
                value: formatNumber(run.residual),
                limit:
                  run.tolerance === null ? 'as the engine sets it' : `at most ${formatNumber(run.tolerance)}`,
              },
              {
                what: 'Error left in a head by stopping here',
                value: `${formatNumber(run.headError)} ${units.length}`,
                limit: 'estimated from the convergence seen',
              },
              {
                what: 'Water balance, inflow and outflow',
                value: `${formatNumber(run.inflow, 2)} and ${formatNumber(run.outflow, 2)} ${rate}`,
                limit: 'equal',
              },
              {
                what: 'Water-balance error',
                value: `${formatNumber(run.errorPercent)} %`,
                limit: `at most ${mostBalanceError} %`,
              },
              {
                what: 'Abstraction achieved',
                value: `${formatNumber(run.abstraction, 1)} ${rate}`,
                limit: 'as section 3 asks',
              },
              ...run.verification.map(([what, value, limit]) => ({ what, value, limit })),
            ]}
            rowKey={(row) => `${row.what} ${row.limit}`}
            columns={[
              { head: 'Check', cell: (row) => row.what },
              {
                head: 'Found',
                words: true,
                cell: (row) => <span className="block min-w-40">{row.value}</span>,
              },
              { head: 'Held against', words: true, cell: (row) => row.limit },
            ]}
          />
          <RunWarnings
            runId={run.id}
            warnings={run.warnings}
            acceptances={run.acceptances}
            mayAccept={false}
            result={undefined}
            day={localTime(project.timeZone).day}
          />
        </>
      ) : (
        <p className="text-flint-2">No run has finished yet.</p>
      )}

      <Heading no="8.3">Uplift, heave and exit gradient</Heading>
      <p>
        These need a vertical section through the dig and its wall. A calculation in plan says nothing about
        them: they must be checked apart, by a qualified engineer, under the local code.
      </p>
    </SectionPage>
  )
}
