import type { SubmissionResult } from '@conform-to/react'
import { parseWithZod } from '@conform-to/zod/v4'
import { type FormEvent, useMemo, useState } from 'react'
import { data, href, Link, type ShouldRevalidateFunctionArgs, useSearchParams } from 'react-router'
import { CheckButton } from '~/book/check-button'
import { sectionStatus } from '~/book/sections.server'
import { Button, DownloadButton } from '~/components/button'
import { localTime } from '~/components/local-time'
import { Caution, Notice } from '~/components/notice'
import { saveBlob } from '~/components/save-blob'
import { type Carried, Heading, type Reference, SectionPage } from '~/components/section-page'
import { toCsv } from '~/components/spreadsheet'
import { acceptanceSchema } from '~/heads/acceptance'
import { acceptancesOf, acceptWarnings } from '~/heads/acceptances.server'
import { balanceState, errorInWords, listed, recordInWords } from '~/heads/account'
import { automaticInterval, mostContours } from '~/heads/contours'
import { featuresOf, groundAt } from '~/heads/features'
import { drawdownBetween, type HeadField, rangeOf } from '~/heads/field'
import { headsCsv } from '~/heads/heads-csv'
import { type FigureOfRun, HeadsFigure } from '~/heads/heads-figure'
import { BalanceTables, type PointLine, PointTable, WellTable } from '~/heads/heads-tables'
import { momentInWords, resultAt } from '~/heads/moment'
import { type RunLine, shortHash, underWay } from '~/heads/run'
import { RunWarnings } from '~/heads/run-warnings'
import { findRun, listRuns, type Run, runPoints } from '~/heads/runs.server'
import { useHeads } from '~/heads/use-heads'
import { bandMeaning } from '~/heads/verification'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { levelUnit } from '~/projects/project'
import type { Result } from '~/solver/result'
import { convert, formatNumber, shownUnit, unitLabel } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/heads'

/** The run of the address, or else the newest finished one; and the run it is compared with, if any. */
export async function loader({ request, context, params }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const search = new URL(request.url).searchParams
  const runs = await listRuns(db, project)
  const finished = runs.filter((run) => run.state === 'done')
  const chosen = finished.find((run) => String(run.id) === search.get('run')) ?? finished[0]
  const other = finished.find((run) => String(run.id) === search.get('against') && run.id !== chosen?.id)
  const [run, against] = await Promise.all([
    chosen && findRun(db, project.id, chosen.id),
    other && findRun(db, project.id, other.id),
  ])
  return {
    projectId: params.projectId,
    project: { number: project.number, verticalDatum: project.verticalDatum, timeZone: project.timeZone },
    mayRun: can(member, 'run', 'case'),
    mayCheck: can(member, 'check', 'section'),
    mayAccept: can(member, 'accept', 'warning'),
    status: await sectionStatus(db, project.id, 'heads'),
    finished,
    open: runs.filter((line) => underWay(line.state)),
    line: chosen,
    run: run && shownRun(run),
    points: run ? await pointLines(db, project.id, run, against, search.get('time')) : [],
    acceptances: run ? await acceptancesOf(db, project.id, run.id) : [],
    against: against && run && comparedRun(run, against),
  }
}

/** Accepts the ticked warnings of a run, with a reason. */
export async function action({ request, context }: Route.ActionArgs) {
  const { project, member } = permit(context, 'accept', 'warning')
  const submission = parseWithZod(await request.formData(), { schema: acceptanceSchema })
  if (submission.status !== 'success') return data({ submission: submission.reply() }, { status: 400 })
  const answer = await acceptWarnings(database(), {
    projectId: project.id,
    userId: member.userId,
    ...submission.value,
  })
  return answer.ok
    ? data({ submission: submission.reply({ resetForm: true }) }, { status: 200 })
    : data({ submission: submission.reply({ formErrors: [answer.message] }) }, { status: 400 })
}

type Database = Parameters<typeof listRuns>[0]

function shownRun({ id, number, caseName, model, result, inputSha256, engine, endedAt, by }: Run) {
  return {
    id,
    number,
    caseName,
    inputSha256,
    engine,
    endedAt: endedAt?.toISOString() ?? null,
    by,
    model,
    result: result && { ...result, history: [] as Result['history'] },
  }
}

/** Heads of a run times `factor` are in the unit of the other. */
function comparedRun(run: Run, against: Run) {
  const factor = convert({ value: 1, unit: against.model.units.length }, run.model.units.length)
  return { id: against.id, number: against.number, caseName: against.caseName, factor }
}

async function pointLines(
  db: Database,
  projectId: number,
  run: Run,
  against: Run | undefined,
  time: string | null,
): Promise<PointLine[]> {
  const [now, before] = await Promise.all([
    runPoints(db, projectId, run.id),
    against ? runPoints(db, projectId, against.id) : [],
  ])
  const heads = new Map(before.map((point) => [point.pointId, point.head]))
  // The database keeps the heads at the end of a run in time; those of an earlier time are in its result.
  const at = run.result ? chosenTime(run.result, time) : -1
  const earlier =
    run.result && at < run.result.times.length - 1
      ? new Map(resultAt(run.result, at).points.map((point) => [point.name, point]))
      : null
  const shown = (metres: number | null) =>
    metres === null ? null : convert({ value: metres, unit: 'm' }, run.model.units.length)
  return now.map(({ pointId, name, x, y, head, why }) => {
    const own = earlier ? (earlier.get(name)?.head[0] ?? null) : shown(head)
    const other = shown(heads.get(pointId) ?? null)
    return {
      name,
      x,
      y,
      head: own,
      before: other,
      drawdown: own === null || other === null ? null : other - own,
      why: own === null ? (why ?? 'no head at this time') : null,
    }
  })
}

/** Index of the reported time that the address asks for, or else of the last; -1 for a steady result. */
function chosenTime(result: Result, asked: string | null): number {
  const index = result.times.findIndex((time) => String(time) === asked)
  return index >= 0 ? index : result.times.length - 1
}

/** How the figure is drawn is the page's own affair; only another run or time needs the server. */
export function shouldRevalidate({
  currentUrl,
  nextUrl,
  formMethod,
  defaultShouldRevalidate,
}: ShouldRevalidateFunctionArgs) {
  const same = ['run', 'against', 'time'].every(
    (name) => currentUrl.searchParams.get(name) === nextUrl.searchParams.get(name),
  )
  const drawnOnly = same && currentUrl.search !== nextUrl.search && currentUrl.pathname === nextUrl.pathname
  return drawnOnly && !formMethod ? false : defaultShouldRevalidate
}

type Loaded = Route.ComponentProps['loaderData']
type Ready = Loaded & {
  line: RunLine
  run: NonNullable<Loaded['run']> & { result: NonNullable<NonNullable<Loaded['run']>['result']> }
}

function isReady(data: Loaded): data is Ready {
  return data.line !== undefined && data.run?.result != null
}

export default function Heads({ loaderData, actionData }: Route.ComponentProps) {
  return isReady(loaderData) ? (
    <Computed data={loaderData} sent={actionData?.submission} />
  ) : (
    <NotComputed data={loaderData} />
  )
}

function NotComputed({ data }: { data: Loaded }) {
  const { projectId, open, mayRun } = data
  const cases = href('/projects/:projectId/cases', { projectId })
  return (
    <SectionPage number={5} title="Heads" references={[]} carried={[]}>
      {open.length > 0 ? (
        <Notice title="A run is under way">
          Run {open[0]?.number} of case {open[0]?.caseName} is being computed.{' '}
          <Link to={cases} className="underline">
            Follow it in section 4
          </Link>
          ; its heads appear here.
        </Notice>
      ) : (
        <Notice title="No heads yet">
          No case has been computed.{' '}
          <Link to={cases} className="underline">
            {mayRun ? 'Compute a case in section 4' : 'Section 4 says what is missing'}
          </Link>
          .
        </Notice>
      )}
    </SectionPage>
  )
}

function Computed({ data, sent }: { data: Ready; sent: SubmissionResult<string[]> | undefined }) {
  const { projectId, project, line, against, points, finished, open, status, mayCheck } = data
  const [search, setSearch] = useSearchParams()
  const times = data.run.result.times
  const at = chosenTime(data.run.result, search.get('time'))
  const run = useMemo(() => ({ ...data.run, result: resultAt(data.run.result, at) }), [data.run, at])
  const { model, result } = run
  const moment = momentInWords(result, unitLabel(model.units.time))
  const [selected, setSelected] = useState<string | null>(null)
  const [near, setNear] = useState<string | null>(null)
  const now = useHeads(href('/projects/:projectId/runs/:runId/heads', { projectId, runId: String(run.id) }))
  const before = useHeads(
    against ? href('/projects/:projectId/runs/:runId/heads', { projectId, runId: String(against.id) }) : null,
    against?.factor,
  )
  const heads =
    now?.state === 'here' ? (now.fields.find(({ time }) => time === times[at])?.field ?? now.field) : null
  const beforeHeads = before?.state === 'here' ? before.field : null
  const drawdown = useMemo(
    () => (heads && beforeHeads ? drawdownBetween(heads, beforeHeads) : null),
    [heads, beforeHeads],
  )
  const length = unitLabel(model.units.length)
  const rate = unitLabel(shownUnit('rate', model.units))
  const datum = levelUnit(length, model.place?.verticalDatum ?? project.verticalDatum)
  const shows = search.get('show') === 'drawdown' && against ? 'drawdown' : 'head'
  const asked = Number(search.get('interval') ?? Number.NaN)
  const interval = Number.isFinite(asked) && asked > 0 ? asked : undefined
  const figure = useMemo(
    (): FigureOfRun | null =>
      heads && {
        heads,
        before: beforeHeads,
        drawdown,
        features: featuresOf(model, result.noFlowEdges),
        unit: length,
        datum,
        converged: result.converged,
        of: `case ${run.caseName}${moment}, run ${run.number}`,
        against: against ? `run ${against.number} (${against.caseName})` : '',
        groundAt: (x, y) => groundAt(model, x, y),
        fileName: `${project.number}-run-${run.number}-${shows === 'drawdown' ? 'drawdown' : 'heads'}`,
      },
    [heads, beforeHeads, drawdown, model, result, length, datum, run, moment, against, project.number, shows],
  )
  const bands = new Map(result.points.map(({ name, band }) => [name, band?.[0] ?? null]))
  const lines = points.map((point) => ({ ...point, band: bands.get(point.name) ?? null }))
  const failed = [now, before].find((loaded) => loaded?.state === 'failed')
  const kinds = useMemo(() => new Map((model.wells ?? []).map(({ name, kind }) => [name, kind])), [model])

  function choose(name: string, value: string) {
    setSearch(
      (params) => {
        const next = new URLSearchParams(params)
        if (value === '') next.delete(name)
        else next.set(name, value)
        return next
      },
      { preventScrollReset: true, replace: name !== 'run' },
    )
  }

  const savePoints = () =>
    saveBlob(
      new Blob([pointsCsv(lines, length, against ? `run ${against.number}` : null)], {
        type: 'text/csv;charset=utf-8',
      }),
      `${project.number}-run-${run.number}-points.csv`,
    )
  const saveHeads = (field: HeadField) =>
    saveBlob(
      new Blob(headsCsv(field, drawdown, length), { type: 'text/csv;charset=utf-8' }),
      `${project.number}-run-${run.number}-heads.csv`,
    )

  return (
    <SectionPage
      number={5}
      title="Heads"
      actions={
        <>
          <RunChoice
            label="Run"
            runs={finished}
            value={String(run.id)}
            onChoose={(id) => choose('run', id)}
          />
          <RunChoice
            label="Against"
            runs={finished.filter(({ id }) => id !== run.id)}
            value={against ? String(against.id) : ''}
            none="no other run"
            onChoose={(id) => choose('against', id)}
          />
          {times.length > 1 && (
            <TimeChoice
              times={times}
              at={at}
              unit={unitLabel(model.units.time)}
              onChoose={(time) => choose('time', time)}
            />
          )}
          <CheckButton
            projectId={Number(projectId)}
            timeZone={project.timeZone}
            status={status}
            mayCheck={mayCheck}
          />
        </>
      }
      status={<RunStatusLine data={data} />}
      references={referencesOf(data)}
      carried={carriedOf({ ...data, run }, heads, drawdown, datum)}
      carryFoot={<Caution>{cautionOf(model.flow)}</Caution>}
    >
      {!result.converged && (
        <Notice tone="alarm" title="This run did not converge">
          Its heads, flows and figures are unfinished numbers. They are shown to help find out why, and are
          not to be used.
        </Notice>
      )}
      {open.length > 0 && (
        <Notice>
          Run {open[0]?.number} of case {open[0]?.caseName} is being computed:{' '}
          <Link to={href('/projects/:projectId/cases', { projectId })} className="underline">
            follow it in section 4
          </Link>
          .
        </Notice>
      )}
      {times.length > 0 && (
        <Notice
          title={`Heads, flows and balance${moment}${at === times.length - 1 ? ', the end of the run' : ''}`}
        >
          {times.length > 1
            ? `The run reports ${times.length} times; everything on this page belongs to this one. The rates are those of the step that ends then.`
            : 'The rates are those of the step that ends then.'}
          {against && ' The run compared with stands at its end.'}
        </Notice>
      )}
      {line.stale && (
        <Notice tone="warn" title="Inputs changed since this run">
          The book would now give case {run.caseName} another input. These are the heads of the input as it
          was frozen:{' '}
          <Link to={href('/projects/:projectId/cases', { projectId })} className="underline">
            compute it again
          </Link>{' '}
          for the book as it stands.
        </Notice>
      )}
      <RunWarnings
        runId={run.id}
        warnings={result.warnings}
        acceptances={data.acceptances}
        mayAccept={data.mayAccept}
        result={sent}
        day={localTime(project.timeZone).day}
      />

      <Heading
        no="5.1"
        aside={
          <IntervalField
            key={`${shows} ${search.get('interval')}`}
            unit={length}
            value={interval}
            range={rangeOfShown(shows === 'drawdown' ? drawdown : heads)}
            onChoose={(text) => choose('interval', text)}
          />
        }
      >
        {against ? <ShowsChoice shows={shows} onChoose={(value) => choose('show', value)} /> : 'Plan'}
      </Heading>
      {failed?.state === 'failed' && (
        <Notice tone="alarm" title="The heads could not be loaded" live>
          {failed.message} Reload the page to try again.
        </Notice>
      )}
      {figure ? (
        <HeadsFigure
          figure={figure}
          shows={shows === 'drawdown' && !drawdown ? 'head' : shows}
          interval={interval}
          selected={selected}
          onNear={setNear}
        />
      ) : (
        !failed && <p className="min-h-80 text-flint-2">Fetching the heads of this run …</p>
      )}
      {result.noFlowEdges.length > 0 && (
        <p className="mt-3 text-[0.93rem] text-flint-2">
          Nothing flows across these edges, since no boundary lies on them: {listed(result.noFlowEdges)}.
        </p>
      )}

      <Heading
        no="5.2"
        aside={
          <Button look="quiet" className="screen-only" onClick={savePoints}>
            CSV
          </Button>
        }
      >
        Heads at named points
      </Heading>
      <PointTable
        lines={lines}
        unit={length}
        compared={against ? `run ${against.number}` : null}
        selected={selected}
        near={near}
        onSelect={setSelected}
      />
      {result.verification && <p className="mt-2 text-[0.93rem] text-flint-2">{bandMeaning}</p>}
      <Heading no="5.3">Water balance</Heading>
      <BalanceTables result={result} rate={rate} />
      <Heading no="5.4">Wells</Heading>
      <WellTable
        result={result}
        kinds={kinds}
        units={{ length, rate }}
        selected={selected}
        near={near}
        onSelect={setSelected}
      />
      <Heading no="5.5">Files of this run</Heading>
      <p className="mb-2 text-[0.93rem] text-flint-2">
        The model file is what was computed, word for word; its SHA-256 is{' '}
        <code className="text-[0.87em] break-all">{run.inputSha256}</code>.
      </p>
      <div className="screen-only flex flex-wrap gap-2">
        <DownloadButton
          href={href('/projects/:projectId/runs/:runId/model', { projectId, runId: String(run.id) })}
          download
        >
          Model file
        </DownloadButton>
        <Button look="quiet" disabled={!heads} onClick={() => heads && saveHeads(heads)}>
          Heads of every cell as CSV
        </Button>
      </div>
    </SectionPage>
  )
}

function RunChoice({
  label,
  runs,
  value,
  none,
  onChoose,
}: {
  label: string
  runs: RunLine[]
  value: string
  none?: string
  onChoose: (id: string) => void
}) {
  return (
    <label className="flex min-w-0 items-center gap-2 text-[0.93rem] text-flint-2">
      {label}
      <select
        value={value}
        onChange={(event) => onChoose(event.target.value)}
        className="max-w-60 min-w-0 rounded border border-rule bg-chalk px-2 py-1 text-flint"
      >
        {none && <option value="">{none}</option>}
        {runs.map((run) => (
          <option key={run.id} value={run.id}>
            {run.number} {run.caseName}
            {run.converged ? '' : ' (not converged)'}
            {run.stale ? ' (inputs changed)' : ''}
          </option>
        ))}
      </select>
    </label>
  )
}

function TimeChoice({
  times,
  at,
  unit,
  onChoose,
}: {
  times: readonly number[]
  at: number
  unit: string
  onChoose: (time: string) => void
}) {
  return (
    <label className="flex min-w-0 items-center gap-2 text-[0.93rem] text-flint-2">
      Time
      <select
        value={String(times[at])}
        onChange={(event) => onChoose(event.target.value === String(times.at(-1)) ? '' : event.target.value)}
        className="max-w-60 min-w-0 rounded border border-rule bg-chalk px-2 py-1 text-flint"
      >
        {times.map((time) => (
          <option key={time} value={String(time)}>
            {formatNumber(time)} {unit}
          </option>
        ))}
      </select>
    </label>
  )
}

function RunStatusLine({ data }: { data: Ready }) {
  const { run, project } = data
  const { minute } = localTime(project.timeZone)
  const { converged } = run.result
  return (
    <p>
      <b className={`font-semibold ${converged ? 'text-moss' : 'text-madder'}`}>
        <span aria-hidden className="mr-1 text-[0.7rem]">
          {converged ? '●' : '◆'}
        </span>
        {converged ? 'converged' : 'did not converge'}
      </b>{' '}
      · run {run.number} by {run.by}
      {run.endedAt && `, ${minute(run.endedAt)}`} · {recordInWords(run.result)} · engine {run.engine}
    </p>
  )
}

/** Two words side by side, the one in force underlined: a choice of what the plan shows, not a tool. */
function ShowsChoice({ shows, onChoose }: { shows: 'head' | 'drawdown'; onChoose: (value: string) => void }) {
  return (
    <span className="inline-flex gap-4">
      {(['head', 'drawdown'] as const).map((what) => (
        <button
          key={what}
          type="button"
          aria-pressed={shows === what}
          onClick={() => onChoose(what === 'head' ? '' : what)}
          className="border-b-2 border-transparent font-normal text-flint-2 hover:text-flint aria-pressed:border-bourne aria-pressed:font-semibold aria-pressed:text-flint"
        >
          {what === 'head' ? 'Heads' : 'Drawdown'}
        </button>
      ))}
    </span>
  )
}

function rangeOfShown(field: HeadField | null): { low: number; high: number } | null {
  return field && rangeOf(field)
}

function IntervalField({
  unit,
  value,
  range,
  onChoose,
}: {
  unit: string
  value: number | undefined
  range: { low: number; high: number } | null
  onChoose: (text: string) => void
}) {
  const automatic = range ? formatNumber(automaticInterval(range.low, range.high)) : ''
  const [text, setText] = useState(value === undefined ? '' : String(value))
  const number = Number(text.replace(',', '.'))
  const problem =
    text.trim() === ''
      ? ''
      : !(number > 0)
        ? 'Give an interval above 0.'
        : range && (range.high - range.low) / number > mostContours
          ? `That would be more than ${mostContours} contours.`
          : ''
  function submit(event: FormEvent) {
    event.preventDefault()
    if (!problem) onChoose(text.trim() === '' ? '' : String(number))
  }
  return (
    <form onSubmit={submit} className="screen-only flex flex-wrap items-center gap-2" noValidate>
      <label className="flex items-center gap-2">
        Contours every
        <input
          inputMode="decimal"
          value={text}
          placeholder={automatic}
          onChange={(event) => setText(event.target.value)}
          onBlur={submit}
          aria-invalid={problem !== '' || undefined}
          aria-describedby="interval-hint"
          className="w-16 rounded border border-rule bg-chalk px-2 py-0.5 text-right text-flint placeholder:text-flint-2 aria-invalid:border-madder"
        />
        {unit}
      </label>
      <span id="interval-hint" className={problem ? 'text-madder' : 'sr-only'}>
        {problem || 'Leave it empty for an automatic interval.'}
      </span>
    </form>
  )
}

function referencesOf({ run, line, projectId, project }: Ready): Reference[] {
  const { day } = localTime(project.timeZone)
  const to = (section: 'cases' | 'ground' | 'water') => `/projects/${projectId}/${section}`
  return [
    {
      no: '4',
      text: (
        <>
          Case{' '}
          <Link to={to('cases')} className="underline">
            {run.caseName}
          </Link>
          , run {run.number}
          {run.endedAt && ` of ${day(run.endedAt)}`}. Input {shortHash(run.inputSha256)}.
        </>
      ),
    },
    ...(line.stale
      ? [{ no: '2–4', text: 'Changed since this run: the input would now be another.', changed: true }]
      : []),
    {
      no: '2',
      text: (
        <>
          <Link to={to('ground')} className="underline">
            Ground
          </Link>
          : {run.model.materials.length} {run.model.materials.length === 1 ? 'material' : 'materials'},{' '}
          {run.model.flow} flow.
        </>
      ),
    },
    {
      no: '3',
      text: (
        <>
          <Link to={to('water')} className="underline">
            Water
          </Link>
          : {counted(run.model.wells, 'well')}, {counted(run.model.boundaries, 'boundary', 'boundaries')},{' '}
          {counted(run.model.recharge, 'recharge zone')}, {counted(run.model.walls, 'cut-off wall')}.
        </>
      ),
    },
  ]
}

function counted(list: readonly unknown[] | undefined, one: string, many = `${one}s`): string {
  const count = list?.length ?? 0
  return `${count === 0 ? 'no' : count} ${count === 1 ? one : many}`
}

function carriedOf(
  { run, against }: Ready,
  heads: HeadField | null,
  drawdown: HeadField | null,
  datum: string,
): Carried[] {
  const { model, result } = run
  const length = unitLabel(model.units.length)
  const rate = unitLabel(shownUnit('rate', model.units))
  const range = heads && rangeOf(heads)
  const deepest = drawdown && rangeOf(drawdown)
  const error = result.balance.errorPercent[0]
  const kinds = new Map((model.wells ?? []).map(({ name, kind }) => [name, kind]))
  const pumped = result.wells.filter(({ name }) => kinds.get(name) === 'abstraction')
  const achieved = pumped.reduce((sum, well) => sum + (well.achieved[0] ?? 0), 0)
  const requested = pumped.reduce((sum, well) => sum + (well.requested[0] ?? 0), 0)
  const unfinished = result.converged ? {} : ({ note: 'run not converged', state: 'alarm' } as const)
  const place = ([x, y]: [number, number]) => `at x ${formatNumber(x, 0)}, y ${formatNumber(y, 0)}`
  const carried: Carried[] = []
  if (range) {
    carried.push(
      {
        label: `Lowest head, ${datum}`,
        value: formatNumber(range.low, 2),
        unit: length,
        note: place(range.lowAt),
        ...unfinished,
      },
      {
        label: 'Highest head',
        value: formatNumber(range.high, 2),
        unit: length,
        note: place(range.highAt),
        ...unfinished,
      },
    )
  }
  if (deepest && against) {
    carried.push({
      label: `Largest drawdown from run ${against.number}`,
      value: formatNumber(deepest.high, 2),
      unit: length,
      note: place(deepest.highAt),
      ...unfinished,
    })
  }
  if (pumped.length > 0) {
    const short = achieved < requested * (1 - 1e-6)
    carried.push({
      label: 'Total abstraction',
      value: formatNumber(achieved),
      unit: rate,
      note: short
        ? `less than the ${formatNumber(requested)} requested`
        : `${pumped.length} ${pumped.length === 1 ? 'well' : 'wells'}, all as requested`,
      ...(short ? { state: 'alarm' as const } : {}),
      ...unfinished,
    })
  }
  if (error !== undefined) {
    carried.push({
      label: 'Water-balance error',
      value: errorInWords(error),
      note: balanceState(error) === 'good' ? 'closes' : 'does not close as a steady run should',
      state: balanceState(error),
      ...unfinished,
    })
  }
  return carried
}

function cautionOf(flow: string): string {
  const left =
    flow === 'confined'
      ? 'It takes flow as horizontal and the saturated thickness as constant'
      : 'It takes flow as horizontal (Dupuit) and leaves out the unsaturated zone and seepage faces'
  return `Drawdown and uplift bear on safety. ${left}; layering finer than section 2 is left out, and heads close to a well are means over its cell. The result does not replace the judgement of a qualified engineer; local codes and licensed practice govern.`
}

function pointsCsv(lines: readonly PointLine[], unit: string, compared: string | null): string {
  const head = ['point', `x (${unit})`, `y (${unit})`, `head (${unit})`]
  const more = compared ? [`head of ${compared} (${unit})`, `drawdown (${unit})`] : []
  const banded = lines.some((line) => line.band)
  const bands = banded ? [`error band from (${unit})`, `error band to (${unit})`] : []
  return toCsv([
    [...head, ...bands, ...more, 'why there is no head'],
    ...lines.map((line) => [
      line.name,
      line.x,
      line.y,
      line.head,
      ...(banded ? [line.band?.[0] ?? null, line.band?.[1] ?? null] : []),
      ...(compared ? [line.before, line.drawdown] : []),
      line.why,
    ]),
  ])
}
