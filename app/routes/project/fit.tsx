import { lazy, Suspense, useMemo, useState } from 'react'
import { data, Form, href, useNavigation } from 'react-router'
import { CheckButton } from '~/book/check-button'
import { sectionStatus } from '~/book/sections.server'
import { Button, DownloadButton } from '~/components/button'
import { DataTable } from '~/components/data-table'
import { Field, SelectField } from '~/components/field'
import { FormMessage } from '~/components/form-message'
import { localTime } from '~/components/local-time'
import { Notice } from '~/components/notice'
import { Heading, SectionPage } from '~/components/section-page'
import { toTsv } from '~/components/spreadsheet'
import { type FitLine, type FitSpan, inProjectUnit, nearestWithinDays, spanFrom } from '~/fit/fit'
import { dayOfLastReading, fitOf, keptComparison, recordFit } from '~/fit/fit.server'
import { fitTable } from '~/fit/fit-table'
import { featuresOf } from '~/heads/features'
import { findRun, isStale, listRuns } from '~/heads/runs.server'
import { idFrom, membershipContext, permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { levelUnit } from '~/projects/project'
import { formatNumber, formatSigned } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/fit'

const OneToOneFigure = lazy(() => import('~/fit/one-to-one-figure'))
const ResidualPlan = lazy(() => import('~/fit/residual-plan'))

export async function loader({ context, request }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const search = new URL(request.url).searchParams
  const [runs, kept, status] = await Promise.all([
    listRuns(db, project),
    keptComparison(db, project.id),
    sectionStatus(db, project.id, 'fit'),
  ])
  const done = runs.filter((run) => run.state === 'done')
  const asked = search.get('run')
  const runId = asked === null ? (kept?.body.runId ?? done[0]?.id) : idFrom(asked)
  const run = runId === undefined ? undefined : await findRun(db, project.id, runId)
  const { span: askedSpan, problem } = spanFrom(search)
  const span: FitSpan =
    askedSpan ?? (asked === null && kept ? kept.body.span : { date: await dayOfLastReading(db, project) })
  const shown = run?.state === 'done' ? run : undefined
  return {
    project,
    status,
    mayCheck: can(member, 'check', 'section'),
    mayKeep: can(member, 'edit', 'fit'),
    runs: done.map(({ id, number, caseName, stale }) => ({ id, number, caseName, stale })),
    problem,
    span,
    kept: kept ? { ...kept.body, by: kept.recordedBy, at: kept.recordedFrom } : null,
    run: shown
      ? {
          id: shown.id,
          number: shown.number,
          caseName: shown.caseName,
          converged: shown.converged === true,
          features: { ...featuresOf(shown.model, shown.result?.noFlowEdges ?? []), points: [] },
          stale: await isStale(db, project, shown),
        }
      : null,
    fit: shown ? await fitOf(db, project, shown, span) : null,
  }
}

export async function action({ context, request }: Route.ActionArgs) {
  permit(context, 'edit', 'fit')
  const { project, member } = context.get(membershipContext)
  const db = database()
  const form = await request.formData()
  const run = await findRun(db, project.id, idFrom(String(form.get('run') ?? '')))
  const search = new URLSearchParams(
    [...form.entries()].flatMap(([key, value]) => (typeof value === 'string' ? [[key, value]] : [])),
  )
  const { span, problem } = spanFrom(search)
  const refuse = (message: string) =>
    data({ error: { '': [message] } as Record<string, string[] | null>, done: undefined }, { status: 400 })
  if (run?.state !== 'done') return refuse('Choose a run that has finished.')
  if (!span) return refuse(problem ?? 'Choose the day or the window of the readings.')
  const kept = await recordFit(db, project, run, span, member.userId)
  if (!kept) return refuse('Somebody kept another comparison at the same moment: look at it, then try again.')
  return data({ error: undefined, done: `The comparison with run ${run.number} is kept as section 7.` })
}

export default function FitPage({ loaderData, actionData, params }: Route.ComponentProps) {
  const { project, runs, run, fit, span, problem, kept, mayKeep } = loaderData
  const unit = project.units.length
  const time = localTime(project.timeZone)
  const busy = useNavigation().state !== 'idle'
  const lines = useMemo(
    () =>
      (fit?.lines ?? []).map((line) => ({
        ...line,
        measured: inProjectUnit(line.measured, unit),
        modelled: inProjectUnit(line.modelled, unit),
        residual: inProjectUnit(line.residual, unit),
      })),
    [fit, unit],
  )
  const compared = useMemo(
    () =>
      lines.flatMap(({ name, measured, modelled }) =>
        measured === null || modelled === null ? [] : [{ name, measured, modelled }],
      ),
    [lines],
  )
  const marks = useMemo(
    () =>
      lines.flatMap(({ name, x, y, residual }) =>
        residual === null ? [] : [{ name, x, y, value: residual, label: formatSigned(residual, 3) }],
      ),
    [lines],
  )
  const statistics = fit?.statistics ?? null
  const query = new URLSearchParams({ ...(run ? { run: String(run.id) } : {}), ...span }).toString()
  const download = (format: string) =>
    `${href('/projects/:projectId/fit/download', { projectId: params.projectId })}?${query}&format=${format}`
  return (
    <SectionPage
      number={7}
      title="Fit"
      actions={
        <CheckButton
          projectId={project.id}
          timeZone={project.timeZone}
          status={loaderData.status}
          mayCheck={loaderData.mayCheck}
        />
      }
      status={
        run ? (
          <>
            Run {run.number}, {run.caseName}
            {!run.converged && <b className="text-madder"> · did not converge: not to be used</b>}
            {run.stale && <span className="text-ochre"> · inputs have changed since this run</span>}
            {' · '}residual = measured − modelled
          </>
        ) : undefined
      }
      references={
        kept
          ? [
              {
                no: '7',
                text: `Kept in the book: run ${kept.runNumber}, readings of ${spanWords(kept.span)}, by ${kept.by}, ${time.day(kept.at)}.`,
              },
              {
                no: '7.1',
                text: `The nearest reading within ${nearestWithinDays} days of a date, or the mean of a window.`,
              },
            ]
          : []
      }
      carried={
        statistics
          ? [
              {
                label: 'Bias (mean residual)',
                value: formatSigned(statistics.bias, 3),
                unit,
                note:
                  statistics.bias > 0
                    ? 'modelled heads are too low on the whole'
                    : 'modelled heads are too high on the whole',
              },
              { label: 'RMSE', value: formatNumber(statistics.rmse, 3), unit },
              { label: 'MAE', value: formatNumber(statistics.mae, 3), unit },
              {
                label: 'Scaled RMSE',
                value: statistics.scaledRmse === null ? '–' : formatNumber(100 * statistics.scaledRmse, 1),
                unit: '%',
                note: 'of the range of the measured heads',
              },
              { label: 'Comparisons n', value: String(statistics.n), note: `of ${lines.length} instruments` },
            ]
          : []
      }
    >
      <FormMessage result={actionData} />
      {runs.length === 0 ? (
        <Notice tone="note" title="There is no finished run to compare with.">
          Run a case in section 4 first.
        </Notice>
      ) : (
        <Form className="screen-only flex flex-wrap items-end gap-3" aria-label="What to compare">
          <div className="min-w-56">
            <SelectField label="Run" name="run" key={`run-${run?.id}`} defaultValue={run?.id}>
              {runs.map((one) => (
                <option key={one.id} value={one.id}>
                  run {one.number}, {one.caseName}
                  {one.stale ? ' (inputs changed since)' : ''}
                </option>
              ))}
            </SelectField>
          </div>
          <SpanFields key={JSON.stringify(span)} span={span} />
          <Button type="submit" look="primary" disabled={busy}>
            Compare
          </Button>
        </Form>
      )}
      {problem && <Notice tone="alarm" title={problem} live />}

      {run && fit && (
        <>
          <Heading
            no="7.1"
            aside={
              <span className="screen-only flex flex-wrap gap-2">
                <CopyButton text={toTsv(fitTable(lines, unit))} />
                <DownloadButton href={download('csv')} download>
                  CSV
                </DownloadButton>
                <DownloadButton href={download('xlsx')} download>
                  XLSX
                </DownloadButton>
              </span>
            }
          >
            Measured and modelled heads, {spanWords(span)}
          </Heading>
          <DataTable
            caption="Measured and modelled heads with residuals"
            rows={lines}
            rowKey={(line) => line.instrumentId}
            empty="There is no instrument yet: section 6 holds them."
            columns={[
              { head: 'Instrument', cell: (line) => line.name },
              { head: 'Measured', unit, cell: (line) => formatNumber(line.measured, 3) },
              { head: 'Modelled', unit, cell: (line) => formatNumber(line.modelled, 3) },
              {
                head: 'Residual',
                unit,
                cell: (line) => <b className="font-semibold">{formatSigned(line.residual, 3)}</b>,
              },
              { head: 'n', cell: (line) => formatNumber(line.n, 0) },
              {
                head: 'Read',
                words: true,
                cell: (line) => (
                  <span className="whitespace-nowrap">
                    {line.firstAt && line.lastAt
                      ? line.firstAt === line.lastAt
                        ? time.minute(line.lastAt)
                        : `${time.day(line.firstAt)} to ${time.day(line.lastAt)}`
                      : '–'}
                  </span>
                ),
              },
              ...(lines.some((line) => line.why)
                ? [
                    {
                      head: 'Note',
                      words: true,
                      cell: (line: FitLine) => <span className="text-flint-2">{line.why}</span>,
                    },
                  ]
                : []),
            ]}
          />
          {mayKeep && (
            <Form method="post" className="screen-only mt-3 flex flex-wrap items-center gap-3">
              <input type="hidden" name="run" value={run.id} />
              {Object.entries(span).map(([key, value]) => (
                <input key={key} type="hidden" name={key} value={value} />
              ))}
              <Button type="submit" disabled={busy || compared.length === 0}>
                Keep this comparison in the book
              </Button>
              <span className="text-[0.9rem] text-flint-2">
                It then stands for section 7 and can be checked.
              </span>
            </Form>
          )}

          {compared.length > 1 && (
            <div className="grid gap-x-8 xl:grid-cols-2">
              <figure className="mt-7 min-w-0">
                <Heading no="7.2">Modelled against measured</Heading>
                <Suspense fallback={<div className="h-96" />}>
                  <OneToOneFigure points={compared} unit={unit} />
                </Suspense>
                <figcaption className="pt-1.5 text-[0.87rem] text-flint-2">
                  Fig. 7.1 Modelled against measured heads, {levelUnit(unit, project.verticalDatum)}. On the
                  dashed line they agree; above it the model is too high.
                </figcaption>
              </figure>
              <figure className="mt-7 min-w-0">
                <Heading no="7.3">Residuals on the plan</Heading>
                <Suspense fallback={<div className="h-96" />}>
                  <ResidualPlan
                    headsUrl={href('/projects/:projectId/runs/:runId/heads', {
                      projectId: params.projectId,
                      runId: String(run.id),
                    })}
                    marks={marks}
                    features={run.features}
                    converged={run.converged}
                    unit={unit}
                    datum={levelUnit(unit, project.verticalDatum)}
                  />
                </Suspense>
                <figcaption className="pt-1.5 text-[0.87rem] text-flint-2">
                  Fig. 7.2 Residuals in {unit} at their instruments, over the heads of run {run.number}.
                </figcaption>
              </figure>
            </div>
          )}
        </>
      )}
    </SectionPage>
  )
}

function spanWords(span: FitSpan): string {
  const { day } = localTime('UTC')
  return 'date' in span ? day(span.date) : `${day(span.from)} to ${day(span.to)}`
}

function SpanFields({ span }: { span: FitSpan }) {
  const [window, setWindow] = useState(!('date' in span))
  return (
    <>
      <SelectField
        label="Readings"
        value={window ? 'window' : 'date'}
        onChange={(event) => setWindow(event.target.value === 'window')}
      >
        <option value="date">nearest to a day</option>
        <option value="window">mean of a window</option>
      </SelectField>
      {window ? (
        <>
          <Field
            label="From"
            type="date"
            name="from"
            required
            defaultValue={'from' in span ? span.from : ''}
          />
          <Field
            label="To"
            type="date"
            name="to"
            required
            defaultValue={'to' in span ? span.to : span.date}
          />
        </>
      ) : (
        <Field
          label="Day"
          type="date"
          name="date"
          required
          defaultValue={'date' in span ? span.date : span.to}
        />
      )}
    </>
  )
}

function CopyButton({ text }: { text: string }) {
  const [said, setSaid] = useState('')
  return (
    <>
      <Button
        look="quiet"
        onClick={() => {
          navigator.clipboard.writeText(text).then(
            () => setSaid('copied'),
            () => setSaid('the browser did not allow it'),
          )
        }}
      >
        Copy
      </Button>
      <output className="self-center text-[0.87rem]">{said}</output>
    </>
  )
}
