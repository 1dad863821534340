import { useState } from 'react'
import { data, Form, href, Link, redirect, useFetcher, useSearchParams } from 'react-router'
import { z } from 'zod'
import { listRows } from '~/book/rows.server'
import { Button, DownloadButton } from '~/components/button'
import { Confirm } from '~/components/confirm'
import { TextField } from '~/components/field'
import { localTime } from '~/components/local-time'
import { Notice } from '~/components/notice'
import { type Carried, Heading, SectionPage } from '~/components/section-page'
import { getObjectStream } from '~/files/files.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { delimiters, encodings, type FileFormat } from '~/readings/file-format'
import { firstBytes, sampleRows } from '~/readings/file-rows.server'
import { ImportBusy } from '~/readings/import-busy'
import {
  choicesOf,
  FileSampleTable,
  type ImportChoices,
  ImportForm,
  settingsFrom,
  startingChoices,
} from '~/readings/import-form'
import {
  ConflictRows,
  CountsLine,
  InstrumentTable,
  ProofLines,
  Question,
  RefusedRows,
  UnknownNames,
} from '~/readings/import-preview'
import {
  type ImportPreview,
  type ImportReceipt,
  importSettingsSchema,
  type SettingsProblems,
  settingsProblems,
} from '~/readings/import-settings'
import {
  discardImport,
  findImport,
  ImportRefused,
  sameFileCommitted,
  settingsOfSameMake,
  startCommit,
  startPreview,
  stopPreview,
  undoImport,
} from '~/readings/imports.server'
import type { Instrument } from '~/readings/instrument'
import { formatNumber } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/import'

const formatSchema = z.object({
  encoding: z.enum(encodings).optional().catch(undefined),
  delimiter: z.enum(delimiters).optional().catch(undefined),
})

export async function loader({ request, context, params }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const record = await findImport(db, project.id, idFrom(params.importId))
  if (!record) throw notFound()
  const query = new URL(request.url).searchParams
  const asked = formatSchema.parse({
    encoding: query.get('encoding') ?? undefined,
    delimiter: query.get('delimiter') ?? undefined,
  })
  const bytes = await firstBytes(await getObjectStream(record.file.key))
  const sample = sampleRows(bytes, {
    encoding: asked.encoding ?? record.settings?.encoding,
    delimiter: asked.delimiter ?? record.settings?.delimiter,
  })
  const header = (sample.rows[sample.headerRow - 1] ?? []).map((cell) => cell.trim())
  const made = record.settings ? undefined : await settingsOfSameMake(db, project.id, header)
  const instruments = await listRows<Instrument>(db, project.id, 'instrument')
  const { key: _, ...file } = record.file
  return {
    project: { id: project.id, timeZone: project.timeZone },
    mayImport: can(member, 'import', 'readings'),
    record: { ...record, file },
    sample,
    remembered: made && { settings: made.settings, file: made.file, at: made.at.toISOString() },
    sameFile: await sameFileCommitted(db, record),
    instruments: instruments
      .filter((row) => !row.body.outOfService || row.id === usedInstrument(record.settings))
      .map((row) => ({ id: row.id, name: row.body.name })),
  }
}

function usedInstrument(
  settings: { instruments: { by: string; instrumentId?: string } } | null,
): string | undefined {
  return settings?.instruments.instrumentId
}

const countsSchema = z.object({
  rows: z.number().int(),
  accepted: z.number().int(),
  identical: z.number().int(),
  conflicts: z.number().int(),
  refused: z.number().int(),
})

const intentSchema = z.discriminatedUnion('intent', [
  z.object({ intent: z.literal('preview'), settings: z.unknown() }),
  z.object({
    intent: z.literal('commit'),
    conflicts: z.enum(['keep', 'take new']),
    reason: z.string().trim().max(500).nullable(),
    counts: countsSchema,
  }),
  z.object({ intent: z.literal('undo') }),
  z.object({ intent: z.literal('discard') }),
  z.object({ intent: z.literal('stop') }),
])

interface Answer {
  error?: string
  problems?: SettingsProblems
  kept?: string[]
}

function refuse(answer: Answer, status: number) {
  return data(answer, { status })
}

export async function action({ request, context, params }: Route.ActionArgs) {
  const { project, user } = permit(context, 'import', 'readings')
  const db = database()
  const record = await findImport(db, project.id, idFrom(params.importId))
  if (!record) throw notFound()
  const isJson = request.headers.get('content-type')?.startsWith('application/json')
  const sent: unknown = isJson ? await request.json() : Object.fromEntries(await request.formData())
  const read = intentSchema.safeParse(sent)
  if (!read.success) return refuse({ error: 'The request could not be read: nothing was changed.' }, 400)
  const order = { project, userId: user.userId, record }
  const one = { projectId: project.id, userId: user.userId, importId: record.id }
  try {
    switch (read.data.intent) {
      case 'preview': {
        const settings = importSettingsSchema.safeParse(read.data.settings)
        if (!settings.success) return refuse({ problems: settingsProblems(settings.error) }, 400)
        await startPreview(db, { ...order, settings: settings.data })
        return data<Answer>({})
      }
      case 'commit': {
        const { conflicts, reason, counts } = read.data
        if (conflicts === 'take new' && !reason) {
          const message = 'Give the reason why the new values take the place of the old ones.'
          return refuse({ problems: { reason: message } }, 400)
        }
        await startCommit(db, { ...order, order: { conflicts, reason, counts } })
        return data<Answer>({})
      }
      case 'undo':
        return data<Answer>({ kept: (await undoImport(db, one)).keptInstruments })
      case 'stop':
        await stopPreview(record)
        return data<Answer>({})
      case 'discard':
        await discardImport(db, one)
    }
  } catch (error) {
    if (error instanceof ImportRefused) return refuse({ error: error.message }, 409)
    throw error
  }
  return redirect(href('/projects/:projectId/readings', { projectId: String(project.id) }))
}

export default function ImportPage({ loaderData, actionData }: Route.ComponentProps) {
  const { project, record, mayImport, sameFile } = loaderData
  const { file, state } = record
  const clock = localTime(project.timeZone)
  const readingsPath = href('/projects/:projectId/readings', { projectId: String(project.id) })
  const answer = actionData as Answer | undefined
  const done = state === 'committed' || state === 'undone'
  return (
    <SectionPage
      number={6}
      title="Readings"
      status={
        <>
          <Link to={readingsPath} className="underline">
            Readings
          </Link>{' '}
          / import of <b className="font-semibold text-flint">{file.name}</b>
        </>
      }
      references={[
        { no: 'File', text: file.name },
        { no: 'Size', text: sizeText(file.bytes) },
        { no: 'SHA-256', text: <span className="break-all">{file.sha256}</span> },
        {
          no: 'Stored',
          text: `${record.createdBy}, ${clock.minute(record.createdAt.toISOString())}; unchanged since`,
        },
      ]}
      carried={carried(record.preview, record.receipt)}
    >
      {answer?.error && <Notice tone="alarm" title={answer.error} live />}
      {answer?.kept && answer.kept.length > 0 && (
        <Notice tone="note" title="Some instruments stay" live>
          {answer.kept.join(', ')}: they were changed, or have other readings or reference levels.
        </Notice>
      )}
      {sameFile && state !== 'undone' && (
        <Notice tone="note" title="This very file is in the readings already">
          <Link
            to={href('/projects/:projectId/readings/imports/:importId', {
              projectId: String(project.id),
              importId: String(sameFile.id),
            })}
          >
            {sameFile.name}
          </Link>
          , committed {clock.minute(sameFile.committedAt.toISOString())}, has the same SHA-256. Read the same
          way, it adds nothing.
        </Notice>
      )}
      {(state === 'previewing' || state === 'committing') && (
        <>
          <ImportBusy projectId={project.id} importId={record.id} state={state} />
          {state === 'previewing' && mayImport && (
            <Form method="post">
              <Button type="submit" name="intent" value="stop">
                Stop reading
              </Button>
            </Form>
          )}
        </>
      )}
      {done && record.receipt && <Receipt loaderData={loaderData} receipt={record.receipt} />}
      {!done && <Reading key={record.id} loaderData={loaderData} />}
    </SectionPage>
  )
}

type Loaded = Route.ComponentProps['loaderData']

/** From the uploaded file to the commit: three steps on one page. */
function Reading({ loaderData }: { loaderData: Loaded }) {
  const { project, record, sample, mayImport, remembered, instruments } = loaderData
  const [query, setQuery] = useSearchParams()
  const fetcher = useFetcher<Answer>()
  const settings = record.settings ?? remembered?.settings
  const detectedHeader = sample.rows[sample.headerRow - 1] ?? []
  const [choices, setChoices] = useState<ImportChoices>(() =>
    settings ? choicesOf(settings) : startingChoices(sample.headerRow, detectedHeader),
  )
  const format: FileFormat = { encoding: sample.encoding, delimiter: sample.delimiter }
  const header = sample.rows[Number(choices.headerRow) - 1] ?? []
  const busy = fetcher.state !== 'idle' || record.state === 'previewing' || record.state === 'committing'
  const problems = fetcher.data?.problems ?? {}
  const { preview } = record
  const clock = localTime(project.timeZone)

  function change(values: Partial<ImportChoices>) {
    setChoices((before) => ({ ...before, ...values }))
  }

  function read(values: Partial<ImportChoices> = {}) {
    const next = { ...choices, ...values }
    setChoices(next)
    const body = { intent: 'preview', settings: settingsFrom(next, format, header) }
    void fetcher.submit(JSON.stringify(body), { method: 'post', encType: 'application/json' })
  }

  function setFormat(next: FileFormat) {
    const search = new URLSearchParams(query)
    search.set('encoding', next.encoding)
    search.set('delimiter', next.delimiter)
    setQuery(search, { replace: true, preventScrollReset: true })
  }

  return (
    <>
      {record.error && (
        <Notice tone="alarm" title="The file could not be taken in" live>
          {record.error} Nothing entered the readings.
        </Notice>
      )}
      {fetcher.data?.error && <Notice tone="alarm" title={fetcher.data.error} live />}
      {remembered && (
        <Notice tone="note" title={`Read as ${remembered.file} was`}>
          That import, committed {clock.day(remembered.at)}, has the same header. Its choices are filled in
          below: look at quantity, unit and time zone before you go on.
        </Notice>
      )}
      <Heading
        no="1"
        aside={
          sample.byteOrderMark ? 'encoding from the byte order mark' : 'encoding and delimiter as detected'
        }
      >
        The file as it stands
      </Heading>
      <fieldset disabled={!mayImport || busy}>
        <FileSampleTable
          rows={sample.rows}
          headerRow={choices.headerRow}
          format={format}
          onFormat={setFormat}
          onHeaderRow={(headerRow) => change({ headerRow })}
          problem={problems.headerRow}
        />
        <Heading no="2">How it is to be read</Heading>
        {Object.keys(problems).length > 0 && !problems.reason && (
          <Notice tone="alarm" title="Something is still to be chosen: see the marked fields." live />
        )}
        <ImportForm
          choices={choices}
          onChange={change}
          problems={problems}
          header={header}
          columns={Math.max(1, ...sample.rows.map((row) => row.length))}
          instruments={instruments}
          siteZone={project.timeZone}
        />
        {mayImport && (
          <div className="flex flex-wrap items-center gap-3">
            <Button look={preview ? 'plain' : 'primary'} onClick={() => read()}>
              {preview ? 'Read the whole file again' : 'Read the whole file'}
            </Button>
            <span className="text-[0.9rem] text-flint-2">Shows what would happen; stores no reading.</span>
          </div>
        )}
      </fieldset>
      {preview && record.state === 'previewed' && (
        <>
          <Heading no="3">What would happen</Heading>
          <Question
            preview={preview}
            busy={busy}
            onOrder={(order) => read({ order })}
            onMark={(decimalMark) => read({ decimalMark })}
          />
          {!preview.question && (
            <>
              <CountsLine counts={preview.counts} />
              <ProofLines preview={preview} timeZone={project.timeZone} />
              <UnknownNames
                preview={preview}
                names={choices.names}
                instruments={instruments}
                addsPlaces={choices.instrumentBy === 'column' && choices.addsPlaces}
                busy={busy || !mayImport}
                onName={(name, answer) => setChoices((before) => withName(before, name, answer))}
                onAddAll={(names) =>
                  setChoices((before) => names.reduce((all, name) => withName(all, name, 'add'), before))
                }
                onRead={() => read()}
              />
              {record.settings && (
                <InstrumentTable
                  instruments={preview.instruments}
                  settings={record.settings}
                  timeZone={project.timeZone}
                />
              )}
              <ConflictRows preview={preview} timeZone={project.timeZone} />
              <RefusedRows preview={preview} />
              {mayImport && <Commit preview={preview} busy={busy} fetcher={fetcher} />}
            </>
          )}
        </>
      )}
      {mayImport && record.state !== 'previewing' && record.state !== 'committing' && (
        <Form method="post" className="screen-only mt-6 border-t border-rule pt-3">
          <Confirm
            label="Discard this upload"
            question="The stored file and this page go. Readings are not touched."
            yes="Discard"
            name="intent"
            value="discard"
          />
        </Form>
      )}
    </>
  )
}

function withName(choices: ImportChoices, name: string, answer: string): ImportChoices {
  const { [name]: _, ...others } = choices.names
  return { ...choices, names: answer === '' ? others : { ...others, [name]: answer } }
}

function Commit({
  preview,
  busy,
  fetcher,
}: {
  preview: ImportPreview
  busy: boolean
  fetcher: ReturnType<typeof useFetcher<Answer>>
}) {
  const [conflicts, setConflicts] = useState<'keep' | 'take new'>('keep')
  const [reason, setReason] = useState('')
  const { counts } = preview
  const enters = counts.accepted + (conflicts === 'take new' ? counts.conflicts : 0)
  const problem = fetcher.data?.problems?.reason

  function commit() {
    const body = { intent: 'commit', conflicts, reason: reason.trim() || null, counts }
    void fetcher.submit(JSON.stringify(body), { method: 'post', encType: 'application/json' })
  }

  return (
    <fieldset disabled={busy} className="screen-only mt-4 border-t-[1.5px] border-flint pt-3">
      {counts.conflicts > 0 && (
        <div className="mb-3">
          <p className="mb-1 font-semibold">Rows in conflict</p>
          {(
            [
              ['keep', 'Keep what is there'],
              [
                'take new',
                'Take the values of this file, each as a new revision; the old one stays on record',
              ],
            ] as const
          ).map(([value, words]) => (
            <label key={value} className="flex items-baseline gap-2">
              <input
                type="radio"
                name="conflicts"
                checked={conflicts === value}
                onChange={() => setConflicts(value)}
              />
              {words}
            </label>
          ))}
          {conflicts === 'take new' && (
            <div className="mt-2 max-w-xl">
              <TextField
                label="Reason"
                rows={2}
                maxLength={500}
                value={reason}
                errors={problem ? [problem] : undefined}
                onChange={(event) => setReason(event.target.value)}
              />
            </div>
          )}
        </div>
      )}
      <div className="flex flex-wrap items-center gap-3">
        <Button look="primary" onClick={commit}>
          Commit {formatNumber(enters, 0)} {enters === 1 ? 'reading' : 'readings'}
          {preview.newInstruments.length > 0 && ` and ${preview.newInstruments.length} new instruments`}
        </Button>
        <span className="text-[0.9rem] text-flint-2">In one step, and can be undone whole.</span>
      </div>
    </fieldset>
  )
}

function Receipt({ loaderData, receipt }: { loaderData: Loaded; receipt: ImportReceipt }) {
  const { project, record, mayImport } = loaderData
  const clock = localTime(project.timeZone)
  const { preview, settings } = record
  return (
    <>
      {record.state === 'undone' && record.undoneAt ? (
        <Notice tone="warn" title="This import was undone">
          By {record.undoneBy}, {clock.minute(record.undoneAt.toISOString())}. Its readings are gone from the
          hydrographs; the file and this receipt stay.
        </Notice>
      ) : (
        <Notice tone="good" title="These readings are in the book">
          Committed by {receipt.committedBy}, {clock.minute(receipt.committedAt)}.
        </Notice>
      )}
      <Heading
        no="6.3"
        aside={
          <DownloadButton
            href={href('/projects/:projectId/readings/imports/:importId/receipt', {
              projectId: String(project.id),
              importId: String(record.id),
            })}
          >
            Download as CSV
          </DownloadButton>
        }
      >
        Import receipt
      </Heading>
      <CountsLine counts={receipt.counts} committed />
      {receipt.counts.conflicts > 0 && (
        <p className="mb-3">
          {receipt.conflictRule === 'keep'
            ? 'Where values contradicted what was there, what was there was kept.'
            : `${formatNumber(receipt.superseded, 0)} values took the place of earlier ones as new revisions: ${receipt.reason}`}
        </p>
      )}
      {receipt.addedInstruments.length > 0 && (
        <p className="mb-3">
          {receipt.addedInstruments.length} instruments came with the file, from{' '}
          {receipt.addedInstruments[0]?.name} to {receipt.addedInstruments.at(-1)?.name}.
        </p>
      )}
      {preview && <ProofLines preview={preview} timeZone={project.timeZone} />}
      {settings && (
        <InstrumentTable instruments={receipt.instruments} settings={settings} timeZone={project.timeZone} />
      )}
      {preview && <ConflictRows preview={preview} timeZone={project.timeZone} />}
      {preview && <RefusedRows preview={preview} />}
      {mayImport && record.state === 'committed' && (
        <Form method="post" className="screen-only mt-6 border-t border-rule pt-3">
          <Confirm
            label="Undo this import"
            question={`All ${formatNumber(receipt.counts.accepted + receipt.superseded, 0)} readings of this file leave the book, values they replaced come back, and instruments that came with it go unless something else uses them.`}
            yes="Undo the whole import"
            name="intent"
            value="undo"
          />
        </Form>
      )}
    </>
  )
}

function carried(preview: ImportPreview | null, receipt: ImportReceipt | null): Carried[] {
  const counts = receipt?.counts ?? (preview?.question ? null : preview?.counts)
  if (!counts) return []
  return [
    {
      label: receipt ? 'Readings added' : 'Readings it would add',
      value: formatNumber(counts.accepted, 0),
      note: `of ${formatNumber(counts.rows, 0)} rows`,
    },
    {
      label: 'Refused',
      value: formatNumber(counts.refused, 0),
      note: counts.refused > 0 ? 'each with its reason' : 'none',
      state: counts.refused > 0 ? 'warn' : 'good',
    },
  ]
}

function sizeText(bytes: number): string {
  if (bytes < 10_000) return `${formatNumber(bytes, 0)} bytes`
  return bytes < 1_000_000
    ? `${formatNumber(bytes / 1000, 0)} kB`
    : `${formatNumber(bytes / 1_000_000, 1)} MB`
}
