import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, href, useNavigation } from 'react-router'
import { z } from 'zod'
import { Button, DownloadButton } from '~/components/button'
import { DataTable } from '~/components/data-table'
import { TextField } from '~/components/field'
import { FormMessage } from '~/components/form-message'
import { localTime } from '~/components/local-time'
import { statusMeaning } from '~/packages/package'
import {
  type Against,
  againstPrediction,
  ageWords,
  type ProgressInstrument,
  presentHead,
} from '~/progress/progress'
import { progressView } from '~/progress/progress.server'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { updateProgress } from '~/projects/projects.server'
import { formatNumber } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/progress'

const linesSchema = z.object({
  stage: z
    .string({ error: 'Say where the work stands.' })
    .trim()
    .min(1, 'Say where the work stands.')
    .max(300),
  nextStep: z
    .string({ error: 'Say what comes next, from whom, by when.' })
    .trim()
    .min(1, 'Say what comes next, from whom, by when.')
    .max(300),
})

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'progress')
  return {
    view: await progressView(database(), project),
    mayEdit: can(member, 'edit', 'progress'),
    now: Date.now(),
  }
}

export async function action({ context, request }: Route.ActionArgs) {
  const { project, member } = permit(context, 'edit', 'progress')
  const submission = parseWithZod(await request.formData(), { schema: linesSchema })
  if (submission.status !== 'success') {
    const reply = submission.reply()
    return data({ error: reply.error, done: undefined }, { status: 400 })
  }
  await updateProgress(database(), project.id, submission.value, member.userId)
  return data({ error: undefined, done: 'The client sees the new lines from now on.' })
}

/** Closer than this counts as "as predicted" (the accuracy that a plan calculation of heads can claim), metres. */
const nearMetres = 0.3

export default function ProgressPage({ loaderData, actionData, params }: Route.ComponentProps) {
  const { view, mayEdit, now } = loaderData
  const { project } = view
  const time = localTime(project.timeZone)
  const near = project.unit === 'ft' ? nearMetres / 0.3048 : nearMetres
  const latest = view.issued.find((document) => document.status === 'issued')
  const newest = view.instruments
    .flatMap((i) => (i.at ? [i.at] : []))
    .sort()
    .at(-1)
  const lines = view.instruments.map((instrument): Line => {
    const present = presentHead(instrument)
    return {
      ...instrument,
      present,
      against: againstPrediction(present, instrument.predicted, near),
      age: ageWords(instrument.at, now, project.timeZone),
    }
  })
  const compared = lines.filter((line) => line.against.shape !== '–')
  const working = view.instruments.filter((i) => !i.outOfService).length
  const provisional = view.instruments.some((i) => i.quality === 'raw' || i.quality === 'provisional')
  const pdf = (id: number) =>
    href('/projects/:projectId/packages/:packageId/pdf', {
      projectId: params.projectId,
      packageId: String(id),
    })
  return (
    <main id="work" className="mx-auto w-full max-w-4xl px-4 py-6">
      <title>{`Progress: ${project.title} · Lavant`}</title>
      <p className="text-flint-2">
        {project.client} · {project.number}
      </p>
      <h1 className="mt-1 text-[1.9rem] leading-tight font-semibold">{project.title}</h1>

      <section
        aria-label="Where it stands"
        className="mt-5 border-l-[3px] border-bourne bg-chalk-2 px-4 py-3.5"
      >
        <p className="text-[1.2rem] leading-snug font-semibold">
          {view.stage || 'The work has not been described yet.'}
        </p>
        {view.nextStep && (
          <p className="mt-1.5">
            <span className="text-flint-2">Next: </span>
            {view.nextStep}
          </p>
        )}
      </section>

      {mayEdit && (
        <details className="screen-only mt-3" open={Boolean(actionData?.error)}>
          <summary className="inline-block text-[0.93rem] text-bourne">Change these two lines</summary>
          <Form method="post" className="mt-3 grid gap-3">
            <TextField
              label="Where the work stands"
              name="stage"
              rows={2}
              defaultValue={view.stage}
              errors={actionData?.error?.stage ?? undefined}
            />
            <TextField
              label="What is next, from whom, by when"
              name="nextStep"
              rows={2}
              defaultValue={view.nextStep}
              errors={actionData?.error?.nextStep ?? undefined}
            />
            <div>
              <Save />
            </div>
          </Form>
        </details>
      )}
      <FormMessage result={actionData?.done ? { done: actionData.done } : undefined} />

      <h2 className="mt-8 mb-2 text-[1.2rem] font-semibold">Calculation package</h2>
      {latest ? (
        <div className="flex flex-wrap items-center justify-between gap-x-6 gap-y-3 border border-rule px-4 py-3">
          <div>
            <p>
              <b className="text-[1.3rem] font-semibold">{latest.revision}</b>{' '}
              <span className="text-moss">
                <span aria-hidden className="mr-1 text-[0.7rem]">
                  ●
                </span>
                {latest.status}
              </span>
            </p>
            <p className="text-flint-2">{statusMeaning[latest.status]}</p>
            <p className="mt-1">
              {latest.purpose}, {time.day(latest.issuedAt)}
            </p>
          </div>
          <DownloadButton look="primary" href={pdf(latest.id)} download>
            Download {latest.revision} (PDF)
          </DownloadButton>
          <p className="w-full text-[0.8rem] break-all text-flint-2">SHA-256 of the PDF: {latest.sha256}</p>
        </div>
      ) : (
        <p className="border border-rule bg-chalk-2 px-4 py-3 text-flint-2">Nothing has been issued yet.</p>
      )}
      {view.issued.length > 1 && (
        <ul className="mt-3 text-[0.93rem]">
          {view.issued
            .filter((document) => document.id !== latest?.id)
            .map((document) => (
              <li key={document.id}>
                <a href={pdf(document.id)} download>
                  {document.revision}
                </a>{' '}
                <span className="text-flint-2">
                  issued {time.day(document.issuedAt)}; {statusMeaning[document.status]}
                </span>
              </li>
            ))}
        </ul>
      )}

      <h2 className="mt-8 mb-1 text-[1.2rem] font-semibold">Groundwater now</h2>
      <p className="mb-3 text-flint-2">
        {newest ? `The newest reading is of ${time.minute(newest)}. ` : 'There are no readings yet. '}
        {view.instruments.length > 0 &&
          `${working} of ${view.instruments.length} instruments are in service. ${provisional ? 'Readings are as taken and not yet checked.' : ''}`}
      </p>
      {compared.length > 0 && <p className="mb-3 font-semibold">{summaryOf(compared)}</p>}
      {view.instruments.length === 0 && (
        <p className="border border-rule bg-chalk-2 px-3 py-2.5 text-flint-2">
          There are no instruments yet.
        </p>
      )}
      <ul className="border-t border-rule empty:hidden sm:hidden">
        {lines.map((line) => (
          <li
            key={line.name}
            className="grid grid-cols-[1fr_auto] gap-x-4 border-b border-rule py-2.5 leading-snug"
          >
            <b className="text-[1.08rem] font-semibold">{line.name}</b>
            <span className="text-right text-[1.08rem] tabular-nums">
              {formatNumber(line.present, 2)} <span className="text-flint-2">{project.unit}</span>
            </span>
            <AgainstPrediction against={line.against} />
            <span className="text-right text-[0.93rem] text-flint-2 tabular-nums">
              predicted {formatNumber(line.predicted, 2)}
            </span>
            <span className="col-span-2 text-[0.93rem] text-flint-2">
              <ReadingAge line={line} />
            </span>
          </li>
        ))}
      </ul>
      <div className="hidden sm:block">
        {lines.length > 0 && (
          <DataTable
            caption="Last reading of each instrument, and what was predicted"
            rows={lines}
            rowKey={(line) => line.name}
            columns={[
              { head: 'Instrument', cell: (line) => line.name },
              { head: 'Water level', unit: project.unit, cell: (line) => formatNumber(line.present, 2) },
              { head: 'Predicted', unit: project.unit, cell: (line) => formatNumber(line.predicted, 2) },
              {
                head: 'Against the prediction',
                words: true,
                cell: (line) => <AgainstPrediction against={line.against} />,
              },
              { head: 'Read', words: true, cell: (line) => <ReadingAge line={line} /> },
            ]}
          />
        )}
      </div>
      <p className="mt-2 text-[0.87rem] text-flint-2">
        Levels in {project.levels}, times of the site ({project.timeZone}). Predicted: the steady state of the
        latest issued package; “as predicted” means within {formatNumber(near, 1)} {project.unit}.
      </p>
      {view.fit && (
        <p className="mt-3">
          In the issued package, {view.fit.n} instruments were compared on{' '}
          {time.day(`${view.fit.day}T12:00:00Z`)}. The calculation missed the measured levels by{' '}
          {formatNumber(view.fit.typical, 2)} {project.unit} on average and by{' '}
          {formatNumber(view.fit.largest, 2)} {project.unit} at most.
        </p>
      )}
      <p className="mt-8 border-l-[3px] border-ochre pl-3 text-[0.9rem] text-flint-2">
        This page informs; it is no approval and no instruction. Issued packages say what they may be used for
        and what they leave out. They do not replace the judgement of a qualified engineer; local codes and
        licensed practice govern.
      </p>
    </main>
  )
}

interface Line extends ProgressInstrument {
  /** The head of the last reading, null when it gave none. */
  present: number | null
  against: Against
  age: string
}

/** "8 of 10 levels are as predicted, 1 is higher, 1 is lower." */
function summaryOf(compared: readonly Line[]): string {
  const count = (shape: Against['shape']) => compared.filter((line) => line.against.shape === shape).length
  const agree = count('●')
  if (agree === compared.length) {
    return agree === 1 ? 'The one level compared is as predicted.' : `All ${agree} levels are as predicted.`
  }
  const others = [
    [count('▲'), 'higher'],
    [count('▼'), 'lower'],
  ] as const
  const rest = others.flatMap(([n, word]) => (n === 0 ? [] : [`${n} ${n === 1 ? 'is' : 'are'} ${word}`]))
  return `${agree} of ${compared.length} levels ${agree === 1 ? 'is' : 'are'} as predicted, ${rest.join(', ')}.`
}

function AgainstPrediction({ against: { shape, words } }: { against: Against }) {
  return (
    <span className={shape === '●' ? 'text-moss' : shape === '–' ? 'text-flint-2' : 'text-ochre'}>
      <span aria-hidden className="mr-1.5 text-[0.75rem]">
        {shape}
      </span>
      {words}
    </span>
  )
}

function ReadingAge({ line }: { line: Line }) {
  return (
    <>
      {line.age}
      {line.status && <span className="text-ochre"> · {line.status}</span>}
      {line.outOfService && <span className="text-madder"> · out of service</span>}
    </>
  )
}

function Save() {
  const busy = useNavigation().state !== 'idle'
  return (
    <Button type="submit" look="primary" disabled={busy}>
      Save for the client
    </Button>
  )
}
