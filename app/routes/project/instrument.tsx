import { useState } from 'react'
import { data, Form, href, Link } from 'react-router'
import { z } from 'zod'
import type { Row } from '~/book/row'
import { findRow, listRows } from '~/book/rows.server'
import { Button } from '~/components/button'
import { Confirm } from '~/components/confirm'
import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { Notice } from '~/components/notice'
import { type Carried, Heading, SectionPage } from '~/components/section-page'
import { enteredNumber } from '~/components/sheet-cells'
import { notFound, permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { levelUnit } from '~/projects/project'
import { Hydrograph } from '~/readings/hydrograph'
import type { Instrument, ReferenceLevel } from '~/readings/instrument'
import { ageText } from '~/readings/instrument-table'
import { type LevelAnswer, type LevelEntry, LevelForm } from '~/readings/level-form'
import { deleteLevel, saveLevel, siteClock, winterOffset } from '~/readings/levels.server'
import { enteredText } from '~/readings/reading'
import { latestReadings, seriesOf, type TracedReading } from '~/readings/readings.server'
import { convert, formatNumber, formatQuantity, type Quantity, type UnitName, unitLabel } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/instrument'

const shownReadings = 30

export async function loader({ context, params }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const row = await findRow<Instrument>(db, project.id, 'instrument', params.instrumentId)
  if (!row) throw notFound()
  const levels = (await listRows<ReferenceLevel>(db, project.id, 'reference level'))
    .filter((level) => level.body.instrumentId === row.id)
    .sort((a, b) => Date.parse(b.body.from) - Date.parse(a.body.from))
  return {
    project,
    mayEdit: can(member, 'edit', 'readings'),
    row,
    levels: levels.map((level) => ({ ...level, clock: siteClock(level.body.from, project.timeZone) })),
    series: await seriesOf(db, project.id, row.id, { maxPoints: 1500 }),
    readings: await latestReadings(db, project.id, row.id, shownReadings),
    winterOffset: winterOffset(project.timeZone),
    now: new Date().toISOString(),
  }
}

const entryText = z.string().max(500)
const intentSchema = z.discriminatedUnion('intent', [
  z.object({
    intent: z.literal('save level'),
    row: z.object({ id: z.string().max(36), version: z.number().int().positive() }).optional(),
    entry: z.object({
      date: entryText,
      time: entryText,
      level: entryText,
      levelled: entryText,
      reason: entryText,
      source: entryText,
    }),
  }),
  z.object({
    intent: z.literal('delete level'),
    id: z.string().max(36),
    version: z.coerce.number().int().positive(),
  }),
])

export async function action({ request, context, params }: Route.ActionArgs) {
  const { project, user } = permit(context, 'edit', 'readings')
  const db = database()
  const row = await findRow<Instrument>(db, project.id, 'instrument', params.instrumentId)
  if (!row) throw notFound()
  const isJson = request.headers.get('content-type')?.startsWith('application/json')
  const sent: unknown = isJson ? await request.json() : Object.fromEntries(await request.formData())
  const read = intentSchema.safeParse(sent)
  if (!read.success) {
    const problems = { '': 'The request could not be read: nothing was saved.' }
    return data<LevelAnswer>({ saved: false, problems }, { status: 400 })
  }
  if (read.data.intent === 'delete level') {
    const { id, version } = read.data
    const message = await deleteLevel(db, { projectId: project.id, userId: user.userId, id, version })
    const answer: LevelAnswer = { saved: message === null, problems: message ? { '': message } : {} }
    return data(answer, { status: message ? 409 : 200 })
  }
  const answer = await saveLevel(db, {
    project,
    userId: user.userId,
    instrumentId: row.id,
    row: read.data.row,
    entry: read.data.entry,
  })
  return data(answer, { status: answer.saved ? 200 : 400 })
}

type Loaded = Route.ComponentProps['loaderData']

export default function InstrumentPage({ loaderData, actionData }: Route.ComponentProps) {
  const { project, row, series, readings, winterOffset } = loaderData
  const { units } = project
  const readingsPath = href('/projects/:projectId/readings', { projectId: String(project.id) })
  const failure = (actionData as LevelAnswer | undefined)?.problems['']
  return (
    <SectionPage
      number={6}
      title="Readings"
      status={
        <>
          <Link to={readingsPath} className="underline">
            Readings
          </Link>{' '}
          / <b className="font-semibold text-flint">{row.body.name}</b>, {row.body.kind}
          {row.body.outOfService && ', out of service'}
        </>
      }
      references={factsOf(loaderData)}
      carried={carriedForward(loaderData)}
    >
      {failure && <Notice tone="alarm" title={failure} live />}
      <Heading
        no="6.2"
        aside={`${formatNumber(
          series.lines.reduce((sum, line) => sum + line.total, 0),
          0,
        )} heads`}
      >
        Hydrograph of {row.body.name}
      </Heading>
      <Hydrograph
        projectId={project.id}
        instrument={{ id: row.id, name: row.body.name }}
        series={series}
        units={units}
        levels={levelUnit(project.units.length, project.verticalDatum)}
        timeZone={project.timeZone}
        winterOffset={winterOffset}
      />
      <p className="mt-1 text-[0.87rem] text-flint-2">
        Ctrl and wheel, or the bar below the drawing, zoom in. The line breaks where readings are missing.
      </p>
      <Levels loaderData={loaderData} />
      <Heading
        no="6.3"
        aside={readings.length === shownReadings ? `the newest ${shownReadings}` : 'all of them'}
      >
        Readings and what each came from
      </Heading>
      <ReadingTable readings={readings} loaderData={loaderData} />
    </SectionPage>
  )
}

function factsOf({ row, project }: Loaded) {
  const { body } = row
  const unit = project.units.length
  const zone = [body.responseTop, body.responseBase].map((level) =>
    level ? formatQuantity(level, unit, 2) : 'not known',
  )
  return [
    { no: 'Position', text: `${enteredNumber(body.x)} ${enteredNumber(body.y)} ${unit}` },
    {
      no: 'Ground',
      text: body.groundLevel ? formatQuantity(body.groundLevel, unit, 2) : 'not levelled',
    },
    { no: 'Response zone', text: `${zone[0]} to ${zone[1]}` },
    ...(body.serial ? [{ no: 'Serial', text: body.serial }] : []),
    ...(body.installedOn ? [{ no: 'Installed', text: body.installedOn }] : []),
    ...(body.source ? [{ no: 'Source', text: body.source }] : []),
    { no: 'Levels', text: levelUnit(project.units.length, project.verticalDatum) },
  ]
}

function carriedForward({ readings, series, project, now }: Loaded): Carried[] {
  const unit = project.units.length
  const clock = localTime(project.timeZone)
  const last = readings[0]
  const lastHead = readings.find((reading) => reading.head !== null)
  const metres = (value: number) => formatNumber(convert({ value, unit: 'm' }, unit), 2)
  const carried: Carried[] = []
  if (lastHead?.head !== null && lastHead) {
    carried.push({
      label: 'Last head',
      value: metres(lastHead.head),
      unit,
      note: `${clock.minute(lastHead.at)}, ${ageText(lastHead.at, now)} old`,
    })
  }
  if (last?.status) {
    carried.push({
      label: 'Last reading',
      value: last.status,
      note: clock.minute(last.at),
      state: 'warn',
    })
  } else if (last && last.head === null) {
    carried.push({ label: 'Last reading', value: 'no head', note: last.why, state: 'warn' })
  }
  const heads = series.lines.flatMap((line) => line.points.map(([, head]) => head))
  if (heads.length > 1) {
    const [low, high] = [Math.min(...heads), Math.max(...heads)]
    carried.push({ label: 'Lowest and highest', value: `${metres(low)} – ${metres(high)}`, unit })
  }
  return carried
}

function Levels({ loaderData }: { loaderData: Loaded }) {
  const { project, levels, mayEdit } = loaderData
  const [open, setOpen] = useState<'new' | string | null>(null)
  const unit = project.units.length
  const edited = levels.find((level) => level.id === open)
  return (
    <>
      <Heading
        no="6.1"
        aside={
          mayEdit && open === null ? (
            <Button className="screen-only" onClick={() => setOpen('new')}>
              Add a reference level
            </Button>
          ) : undefined
        }
      >
        Reference levels
      </Heading>
      {open !== null && (
        <LevelForm
          key={open}
          units={project.units}
          edited={edited && { id: edited.id, version: edited.version, entry: entryOf(edited) }}
          onDone={() => setOpen(null)}
        />
      )}
      <DataTable
        caption="Reference levels"
        rows={levels}
        rowKey={(level) => level.id}
        empty="No reference level yet: dips and pressure heads give no head without one. Levels do."
        columns={[
          { head: 'In force from', cell: (level) => `${level.clock.date} ${level.clock.time}` },
          { head: 'Level', unit, cell: (level) => levelText(level.body.level, unit) },
          { head: 'What was levelled', words: true, cell: (level) => level.body.levelled },
          { head: 'Reason', words: true, cell: (level) => level.body.reason },
          { head: 'Source', words: true, cell: (level) => level.body.source || '–' },
          {
            head: 'Recorded',
            words: true,
            cell: (level) => (
              <span className="whitespace-nowrap text-flint-2">
                {level.recordedBy}, version {level.version}
              </span>
            ),
          },
          ...(mayEdit
            ? [
                {
                  head: 'Change',
                  words: true,
                  cell: (level: Row<ReferenceLevel>) => (
                    <Form method="post" className="screen-only flex items-start gap-3">
                      <button
                        type="button"
                        className="text-[0.9rem] text-bourne hover:underline"
                        onClick={() => setOpen(level.id)}
                      >
                        Correct
                      </button>
                      <input type="hidden" name="id" value={level.id} />
                      <input type="hidden" name="version" value={level.version} />
                      <Confirm
                        label="Delete"
                        question="Heads of its time are derived with the level before it, or not at all."
                        yes="Delete"
                        name="intent"
                        value="delete level"
                      />
                    </Form>
                  ),
                },
              ]
            : []),
        ]}
      />
    </>
  )
}

function levelText(level: Quantity, unit: UnitName): string {
  const shown = level.unit === unit ? enteredNumber(level.value) : formatNumber(convert(level, unit), 3)
  return level.unit === unit ? shown : `${shown} (${enteredNumber(level.value)} ${unitLabel(level.unit)})`
}

function entryOf(level: Row<ReferenceLevel> & { clock: { date: string; time: string } }): LevelEntry {
  const { body, clock } = level
  return {
    ...clock,
    level: `${body.level.value} ${unitLabel(body.level.unit)}`,
    levelled: body.levelled,
    reason: body.reason,
    source: body.source,
  }
}

function ReadingTable({ readings, loaderData }: { readings: TracedReading[]; loaderData: Loaded }) {
  const { project } = loaderData
  const unit = project.units.length
  const clock = localTime(project.timeZone)
  return (
    <DataTable
      caption="Newest readings"
      rows={readings}
      rowKey={(reading) => `${reading.at} ${reading.quantity}`}
      empty="No reading yet: import a file in section 6.3."
      columns={[
        { head: 'Taken at', cell: (reading) => clock.minute(reading.at) },
        {
          head: 'Head',
          unit,
          cell: (reading) =>
            reading.head === null ? (
              <span className="text-ochre">{reading.why}</span>
            ) : (
              formatNumber(convert({ value: reading.head, unit: 'm' }, unit), 3)
            ),
        },
        { head: 'Quantity', words: true, cell: (reading) => reading.quantity },
        {
          head: 'As entered',
          cell: (reading) => enteredText(reading),
        },
        { head: 'Status', words: true, cell: (reading) => reading.status ?? '' },
        {
          head: 'Reference level',
          unit,
          cell: (reading) => (reading.reference ? levelText(reading.reference.level, unit) : '–'),
        },
        {
          head: 'From',
          words: true,
          cell: (reading) => (
            <span className="whitespace-nowrap">
              <Link
                to={href('/projects/:projectId/readings/imports/:importId', {
                  projectId: String(project.id),
                  importId: String(reading.importId),
                })}
              >
                {reading.file}
              </Link>
              , row {reading.fileRow}
              {reading.revision > 1 && `, revision ${reading.revision}`}
            </span>
          ),
        },
        { head: 'Quality', words: true, cell: (reading) => reading.quality },
      ]}
    />
  )
}
