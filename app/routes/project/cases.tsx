import { useEffect, useMemo, useState } from 'react'
import { href, Link, useFetcher } from 'react-router'
import { CheckButton } from '~/book/check-button'
import { SaveState } from '~/book/save-state'
import { sectionStates } from '~/book/sections.server'
import { useRows } from '~/book/use-rows'
import { type Case, caseSchema, mostCells, settingsOf } from '~/cases/case'
import { CaseSheet, type SheetCase } from '~/cases/case-sheet'
import { type Finding, freezeCase } from '~/cases/freeze'
import { caseInputs } from '~/cases/inputs.server'
import { copyOfCase, firstBaseCase, freeName, type SheetLine, sheetLines } from '~/cases/sheet-lines'
import { Button } from '~/components/button'
import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { Notice } from '~/components/notice'
import { type Carried, Heading, type Reference, SectionPage } from '~/components/section-page'
import { type RunLine, shortHash, underWay } from '~/heads/run'
import { RunProgress } from '~/heads/run-progress'
import { listRuns, runStatus, type StartAnswer } from '~/heads/runs.server'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { formatNumber } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/cases'

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const runs = await listRuns(db, project)
  // Under way, or stopped by a restart and not computed since: these are followed on the page.
  const followed = runs.filter((run, index) => {
    if (underWay(run.state)) return true
    return run.state === 'interrupted' && !runs.slice(0, index).some((later) => later.caseId === run.caseId)
  })
  const statuses = await Promise.all(followed.map((run) => runStatus(db, project.id, run.id)))
  const section = (await sectionStates(db, project.id)).find((one) => one.key === 'cases')
  if (!section) throw new Error('The book has no section 4.')
  const { project: _, ...inputs } = await caseInputs(db, project)
  return {
    project: {
      id: project.id,
      number: project.number,
      title: project.title,
      crsEpsg: project.crsEpsg,
      verticalDatum: project.verticalDatum,
      units: project.units,
      timeZone: project.timeZone,
    },
    userId: member.userId,
    mayEdit: can(member, 'edit', 'cases'),
    mayRun: can(member, 'run', 'case'),
    mayCheck: can(member, 'check', 'section'),
    section,
    inputs,
    runs,
    followed: statuses.flatMap((status) => status ?? []),
  }
}

const schemas = { case: caseSchema }

export default function Cases({ loaderData }: Route.ComponentProps) {
  const { project, userId, mayEdit, mayRun, runs, followed } = loaderData
  const book = useRows(loaderData.inputs.cases, {
    projectId: project.id,
    userId,
    schemas,
    editable: mayEdit,
  })
  const cases = useMemo(
    () =>
      book.rows('case').map(
        (row): SheetCase => ({
          id: row.id,
          body: row.body as unknown as Case,
          problems: row.problems,
          state: row.state,
        }),
      ),
    [book],
  )
  const base = cases.find((one) => one.body.isBase)?.body
  const inputs = useMemo(() => ({ ...loaderData.inputs, project }), [loaderData.inputs, project])
  const lines = useMemo(() => sheetLines(inputs, base), [inputs, base])
  const answers = useMemo(() => {
    const drafts = cases.map((one) => ({
      id: one.id,
      version: 0,
      kind: 'case',
      position: 0,
      body: one.body,
      recordedFrom: '',
      recordedBy: '',
    }))
    return new Map(cases.map((one) => [one.id, freezeCase({ ...inputs, cases: drafts }, one.id)]))
  }, [cases, inputs])
  const runner = useRunner(project.id, book.unsaved, book.retry)

  function add(body: Case) {
    book.apply([
      {
        op: 'add',
        kind: 'case',
        id: crypto.randomUUID(),
        body: body as unknown as Record<string, unknown>,
        cells: {},
      },
    ])
  }
  const newCase = (source: Case) =>
    add(copyOfCase(source, freeName(cases, source.isBase ? 'Case 1' : `${source.name}, copy`)))

  const findings = cases.map((one) => {
    const answer = answers.get(one.id)
    return {
      one,
      problems: answer && !answer.ok ? answer.problems : [],
      notices: answer?.ok ? answer.frozen.notices : [],
    }
  })
  const foot = [
    {
      label: 'Before it can run',
      cell: (one: SheetCase) => {
        const found = findings.find((entry) => entry.one.id === one.id)
        const problems = found?.problems.length ?? 0
        const notices = found?.notices.length ?? 0
        if (problems > 0)
          return (
            <span className="text-madder">
              {problems} {problems === 1 ? 'thing is' : 'things are'} missing
            </span>
          )
        if (notices > 0)
          return (
            <span className="text-ochre">
              {notices} {notices === 1 ? 'remark' : 'remarks'}
            </span>
          )
        return <span className="text-moss">ready</span>
      },
    },
    {
      label: 'Last run',
      cell: (one: SheetCase) => (
        <LastRun projectId={project.id} run={runs.find((r) => r.caseId === one.id)} />
      ),
    },
    ...(mayRun || mayEdit
      ? [
          {
            label: 'Actions',
            cell: (one: SheetCase) => (
              <span className="screen-only flex flex-wrap justify-end gap-1.5">
                {mayEdit && (
                  <Button look="quiet" onClick={() => newCase(one.body)} aria-label={`Copy ${one.body.name}`}>
                    {one.body.isBase ? 'New case from it' : 'Copy'}
                  </Button>
                )}
                {mayEdit && (!one.body.isBase || cases.length === 1) && (
                  <Button
                    look="quiet"
                    onClick={() => book.apply([{ op: 'delete', id: one.id }])}
                    aria-label={`Delete ${one.body.name}`}
                  >
                    Delete
                  </Button>
                )}
                {mayRun && (
                  <Button
                    look="primary"
                    disabled={!answers.get(one.id)?.ok || runner.busy || one.problems.length > 0}
                    onClick={() => runner.start(one.id)}
                    aria-label={`Run ${one.body.name}`}
                  >
                    {runner.waitingFor === one.id ? 'Starting…' : 'Run'}
                  </Button>
                )}
              </span>
            ),
          },
        ]
      : []),
  ]

  return (
    <SectionPage
      number={4}
      title="Cases"
      references={referencesOf(cases)}
      carried={carriedOf(runs, cases, project)}
      status={<SaveState book={book} />}
      actions={
        <>
          {mayEdit && (
            <>
              {(['undo', 'redo'] as const).map((step) => (
                <Button
                  key={step}
                  look="quiet"
                  onClick={book[step]}
                  disabled={!book.sheet('case').edits?.[step === 'undo' ? 'canUndo' : 'canRedo']}
                >
                  {step === 'undo' ? 'Undo' : 'Redo'}
                </Button>
              ))}
              {base && <Button onClick={() => newCase(base)}>Add case</Button>}
            </>
          )}
          <CheckButton
            projectId={project.id}
            timeZone={project.timeZone}
            status={loaderData.section}
            mayCheck={loaderData.mayCheck}
          />
        </>
      }
    >
      {book.conflicts.map((conflict) => (
        <Notice key={conflict.id} tone="warn" live title={conflictTitle(conflict.theirs)}>
          {conflict.mine && conflict.theirs && (
            <Differences
              lines={lines}
              mine={conflict.mine as unknown as Case}
              theirs={conflict.theirs.body as unknown as Case}
            />
          )}
          <p className="mt-2 flex flex-wrap gap-2">
            <Button onClick={() => book.resolve(conflict.id, conflict.theirs?.body ?? null)}>
              Take what is in the book
            </Button>
            <Button onClick={() => book.resolve(conflict.id, conflict.mine)}>Keep what I entered</Button>
          </p>
        </Notice>
      ))}
      <Heading no="4.1">Case sheet</Heading>
      {cases.length === 0 ? (
        <Notice title="There is no case yet.">
          <p>
            A case says what is computed: flow, extent and cell size of the grid, and whatever differs from
            sections 2 and 3.
          </p>
          {mayEdit && (
            <p className="mt-2">
              <Button look="primary" onClick={() => add(firstBaseCase({ ...inputs, cases: [] }))}>
                Add the base case
              </Button>
            </p>
          )}
        </Notice>
      ) : (
        <CaseSheet
          cases={cases}
          lines={lines}
          editable={mayEdit}
          onSet={(id, values) => book.set(id, values)}
          foot={foot}
        />
      )}
      <p className="mt-1.5 text-[0.87rem] text-flint-2">
        A blank cell inherits from the base case; bold cells with a bar on their left differ from it. At most{' '}
        {formatNumber(mostCells, 0)} cells.
      </p>
      <RunAnswer answer={runner.answer} projectId={project.id} />
      {findings.map(({ one, problems, notices }) => (
        <Findings
          key={one.id}
          projectId={project.id}
          name={one.body.name}
          problems={problems}
          notices={notices}
        />
      ))}

      <Heading no="4.2">Runs</Heading>
      {followed.map((status) => (
        <RunProgress
          key={status.id}
          projectId={project.id}
          run={status}
          tolerance={toleranceOf(cases, runs.find((run) => run.id === status.id)?.caseId)}
          mayRun={mayRun}
        />
      ))}
      <Runs projectId={project.id} timeZone={project.timeZone} runs={runs} />
    </SectionPage>
  )
}

/** Starts runs; a draft is saved first, so that what runs is what the sheet shows. */
function useRunner(projectId: number, unsaved: boolean, save: () => void) {
  const fetcher = useFetcher<StartAnswer>()
  const [waitingFor, setWaitingFor] = useState<string | null>(null)
  const { submit } = fetcher
  useEffect(() => {
    if (waitingFor === null || unsaved) return
    void submit({ caseId: waitingFor }, { method: 'post', action: `/projects/${projectId}/runs` })
    setWaitingFor(null)
  }, [waitingFor, unsaved, submit, projectId])
  return {
    busy: waitingFor !== null || fetcher.state !== 'idle',
    waitingFor: waitingFor ?? (fetcher.state === 'idle' ? null : (fetcher.formData?.get('caseId') ?? null)),
    answer: fetcher.data,
    start(caseId: string) {
      if (unsaved) save()
      setWaitingFor(caseId)
    },
  }
}

function RunAnswer({ answer, projectId }: { answer: StartAnswer | undefined; projectId: number }) {
  if (!answer || answer.ok) return null
  if (answer.reason === 'too many') return <Notice tone="warn" live title={answer.message} />
  return (
    <Notice tone="alarm" live title="This case cannot run yet.">
      <FindingList projectId={projectId} findings={answer.problems} />
    </Notice>
  )
}

function Findings({
  projectId,
  name,
  problems,
  notices,
}: {
  projectId: number
  name: string
  problems: Finding[]
  notices: Finding[]
}) {
  if (problems.length > 0)
    return (
      <Notice tone="alarm" title={`${name} cannot run yet`}>
        <FindingList projectId={projectId} findings={problems} />
      </Notice>
    )
  if (notices.length === 0) return null
  return (
    <Notice tone="warn" title={`${name} can run; look at this first`}>
      <FindingList projectId={projectId} findings={notices} />
    </Notice>
  )
}

const sectionNumber: Partial<Record<Finding['section'], number>> = { ground: 2, water: 3, cases: 4 }

function FindingList({ projectId, findings }: { projectId: number; findings: Finding[] }) {
  return (
    <ul className="list-none">
      {findings.map((finding) => (
        <li key={`${finding.section} ${finding.rowId} ${finding.message}`}>
          <Link className="underline" to={`/projects/${projectId}/${finding.section}`}>
            {sectionNumber[finding.section]}
          </Link>{' '}
          {finding.row && <b className="font-semibold">{finding.row}: </b>}
          {finding.message}
        </li>
      ))}
    </ul>
  )
}

function LastRun({ projectId, run }: { projectId: number; run: RunLine | undefined }) {
  if (!run) return <span className="text-flint-2">none</span>
  return (
    <>
      {run.state === 'done' ? (
        <Link className="underline" to={`/projects/${projectId}/heads?run=${run.id}`}>
          Run {run.number}
        </Link>
      ) : (
        `Run ${run.number}`
      )}{' '}
      <RunStateWords run={run} />
    </>
  )
}

function RunStateWords({ run }: { run: RunLine }) {
  if (run.state === 'done') {
    return (
      <>
        <span className={run.converged ? 'text-moss' : 'text-madder'}>
          {run.converged ? 'converged' : 'did not converge'}
        </span>
        {run.stale && <span className="block text-ochre">the book has changed since</span>}
      </>
    )
  }
  const colour = run.state === 'failed' ? 'text-madder' : underWay(run.state) ? 'text-bourne' : 'text-ochre'
  return <span className={colour}>{run.state}</span>
}

function Runs({ projectId, timeZone, runs }: { projectId: number; timeZone: string; runs: RunLine[] }) {
  const time = localTime(timeZone)
  return (
    <DataTable
      caption="Runs"
      empty="No case has been run yet."
      rows={runs}
      rowKey={(run) => run.id}
      columns={[
        {
          head: 'Run',
          cell: (run) =>
            run.state === 'done' ? (
              <Link to={`/projects/${projectId}/heads?run=${run.id}`}>{run.number}</Link>
            ) : (
              run.number
            ),
        },
        { head: 'Case', words: true, cell: (run) => run.caseName },
        {
          head: 'State',
          words: true,
          cell: (run) => (
            <>
              <RunStateWords run={run} />
              {run.error && <span className="block max-w-72 text-[0.9em] text-flint-2">{run.error}</span>}
            </>
          ),
        },
        { head: 'Balance error', unit: '%', cell: (run) => balanceWords(run.errorPercent) },
        {
          head: 'Input',
          words: true,
          cell: (run) => (
            <a
              href={href('/projects/:projectId/runs/:runId/model', {
                projectId: String(projectId),
                runId: String(run.id),
              })}
              download
              title={`SHA-256 ${run.inputSha256}`}
              aria-label={`Model file of run ${run.number}`}
            >
              {shortHash(run.inputSha256)}
            </a>
          ),
        },
        { head: 'Started', words: true, cell: (run) => time.minute(run.createdAt) },
        { head: 'Time', unit: 's', cell: (run) => duration(run) },
        { head: 'By', words: true, cell: (run) => run.by },
      ]}
    />
  )
}

function duration(run: RunLine): string {
  if (!run.endedAt || run.state !== 'done') return '–'
  return formatNumber((Date.parse(run.endedAt) - Date.parse(run.createdAt)) / 1000, 1)
}

/** Below 0.001 % nobody needs more figures. */
function balanceWords(percent: number | null): string {
  if (percent === null) return '–'
  return Math.abs(percent) < 0.0005 ? '0.000' : formatNumber(percent, 3)
}

function toleranceOf(cases: readonly SheetCase[], caseId: string | undefined): number | undefined {
  const own = cases.find((one) => one.id === caseId)?.body
  const base = cases.find((one) => one.body.isBase)?.body
  return own && settingsOf(base, own).tolerance
}

function referencesOf(cases: readonly SheetCase[]): Reference[] {
  const notes = cases.filter((one) => one.body.note !== '')
  return [
    ...notes.map((one, index) => ({ no: `4.${index + 1}`, text: `${one.body.name}: ${one.body.note}` })),
    {
      no: 'Grid',
      text: 'Cells of one size fill the extent exactly; where the extent is no whole multiple of the cell size, they are a little larger or smaller.',
    },
    {
      no: 'Solver',
      text: 'Automatic takes conjugate gradients with multigrid, and successive over-relaxation where these do not get there; the run says which it was. It has converged once its true residual, relative to the right-hand side, is below the tolerance.',
    },
  ]
}

function carriedOf(runs: RunLine[], cases: readonly SheetCase[], project: { id: number }): Carried[] {
  const last = runs.find((run) => run.state === 'done')
  const stale = runs.filter((run, index) => {
    const isLast = runs.findIndex((other) => other.caseId === run.caseId && other.state === 'done') === index
    return isLast && run.stale && cases.some((one) => one.id === run.caseId)
  })
  return [
    { label: 'Cases', value: cases.length },
    ...(last
      ? [
          {
            label: 'Latest run',
            value: last.number,
            note: (
              <>
                {last.converged ? 'converged' : 'did not converge'}, {last.caseName}{' '}
                <Link className="underline" to={`/projects/${project.id}/heads?run=${last.id}`}>
                  → 5
                </Link>
              </>
            ),
            state: last.converged ? ('good' as const) : ('alarm' as const),
          },
          {
            label: 'Water-balance error',
            value: balanceWords(last.errorPercent),
            unit: '%',
            note: `run ${last.number}`,
          },
        ]
      : []),
    ...(stale.length > 0
      ? [
          {
            label: 'Cases to run again',
            value: stale.length,
            note: stale.map((run) => run.caseName).join(', '),
            state: 'warn' as const,
          },
        ]
      : []),
  ]
}

function conflictTitle(theirs: { by: string; body: Record<string, unknown> } | null): string {
  if (!theirs) return 'Somebody deleted a case that you changed.'
  return `${theirs.by} changed ${String(theirs.body.name)} while you did.`
}

/** Both values of everything that differs, in the words of the sheet. */
function Differences({ lines, mine, theirs }: { lines: SheetLine[]; mine: Case; theirs: Case }) {
  const differing = [
    { key: 'name', label: 'Name', unit: '', own: (body: Case) => body.name },
    ...lines.filter((line) => !line.computed),
  ].filter((line) => line.own(mine) !== line.own(theirs))
  return (
    <ul>
      {differing.map((line) => (
        <li key={line.key}>
          <b className="font-semibold">{line.label}</b>: in the book {line.own(theirs) || 'blank'}
          {line.unit && ` ${line.unit}`}; yours {line.own(mine) || 'blank'}
          {line.unit && ` ${line.unit}`}
        </li>
      ))}
    </ul>
  )
}
