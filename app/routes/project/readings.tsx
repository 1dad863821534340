import { useMemo, useState } from 'react'
import { href } from 'react-router'
import { CheckButton } from '~/book/check-button'
import { ConflictPanel } from '~/book/conflict-panel'
import { referenceLines } from '~/book/references'
import { listRows, listUses } from '~/book/rows.server'
import { SaveState } from '~/book/save-state'
import { sectionStatus } from '~/book/sections.server'
import { useRows } from '~/book/use-rows'
import { localTime } from '~/components/local-time'
import { type Carried, Heading, SectionPage } from '~/components/section-page'
import type { DrawnGeometry } from '~/ground/drawing/drawn-feature'
import { pointFeatures } from '~/ground/drawn-features'
import type { PlanImage, Point } from '~/ground/ground'
import { SiteDrawing } from '~/ground/site-drawing'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { levelUnit } from '~/projects/project'
import { ImportList } from '~/readings/import-list'
import { listImports } from '~/readings/imports.server'
import type { Instrument } from '~/readings/instrument'
import {
  InstrumentSheet,
  instrumentColumns,
  instrumentFeatures,
  newInstrument,
  readingSchemas,
} from '~/readings/instrument-sheet'
import { InstrumentTable } from '~/readings/instrument-table'
import { coursesOf, currentReferenceLevels, lastReadings } from '~/readings/readings.server'
import { Upload } from '~/readings/upload'
import { rowKinds } from '~/row-kinds.server'
import { formatNumber } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/readings'

const year = 365.25 * 86_400_000

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const now = new Date()
  const last = await lastReadings(db, project.id)
  const newest = last.flatMap((line) => (line.last ? [Date.parse(line.last.at)] : []))
  const to = newest.length > 0 ? new Date(Math.max(...newest)) : now
  const courses = await coursesOf(db, project.id, { from: new Date(to.getTime() - year), to, points: 80 })
  const levels = await currentReferenceLevels(db, project.id, now)
  const points = await listRows<Point>(db, project.id, 'point')
  const imports = await listImports(db, project.id)
  return {
    project,
    member: { userId: member.userId, mayEdit: can(member, 'edit', 'readings') },
    mayImport: can(member, 'import', 'readings'),
    mayCheck: can(member, 'check', 'section'),
    status: await sectionStatus(db, project.id, 'readings'),
    rows: await listRows<Instrument>(db, project.id, 'instrument'),
    points,
    planImage: (await listRows<PlanImage>(db, project.id, 'plan image'))[0]?.body ?? null,
    uses: await listUses(db, project.id, rowKinds),
    now: now.toISOString(),
    lines: last.map((line) => ({
      ...line,
      referenceLevel: levels.get(line.instrumentId) ?? null,
      course: courses.get(line.instrumentId) ?? [],
    })),
    imports: imports.map((record) => {
      const counts = record.receipt?.counts ?? (record.preview?.question ? null : record.preview?.counts)
      return {
        id: record.id,
        file: record.file.name,
        state: record.state,
        createdAt: record.createdAt.toISOString(),
        createdBy: record.createdBy,
        rows: counts?.rows ?? null,
        accepted: record.receipt?.counts.accepted ?? null,
        superseded: record.receipt?.superseded ?? 0,
        refused: counts?.refused ?? null,
      }
    }),
  }
}

export default function ReadingsPage({ loaderData }: Route.ComponentProps) {
  const { project, member, mayImport, mayCheck, status, rows, points, uses, now, lines, imports, planImage } =
    loaderData
  const { units, timeZone } = project
  const book = useRows(rows, {
    projectId: project.id,
    userId: member.userId,
    schemas: readingSchemas,
    editable: member.mayEdit,
  })
  const [selectedId, onSelect] = useState<string | null>(null)
  const [hoveredId, onHover] = useState<string | null>(null)
  const pointNames = useMemo(() => points.map((row) => ({ id: row.id, name: row.body.name })), [points])
  const features = useMemo(() => {
    // A point that an instrument stands for would be drawn and named twice.
    const taken = new Set(book.rows('instrument').map((row) => row.body.pointId))
    const free = points.filter((row) => !taken.has(row.id))
    return [
      ...pointFeatures(free).map((feature) => ({ ...feature, muted: true })),
      ...instrumentFeatures(book),
    ]
  }, [book, points])
  const shownPlan = useMemo(
    () =>
      planImage && {
        ...planImage,
        url: href('/projects/:projectId/files/:fileId', {
          projectId: String(project.id),
          fileId: String(planImage.fileId),
        }),
      },
    [planImage, project.id],
  )

  function draw(_kind: string, geometry: DrawnGeometry) {
    if (geometry.type !== 'point') return
    const id = crypto.randomUUID()
    const [x, y] = geometry.at
    book.apply([{ op: 'add', id, kind: 'instrument', body: { ...newInstrument(book), x, y }, cells: {} }])
    onSelect(id)
  }

  function place(id: string, geometry: DrawnGeometry) {
    if (geometry.type === 'point') book.set(id, { x: geometry.at[0], y: geometry.at[1] })
  }

  const references = referenceLines(
    '6.1',
    book.sound<Instrument>('instrument').map(({ body, recordedFrom }) => ({
      name: body.name,
      source: body.source,
      recordedFrom,
    })),
    status.checkedAt,
  )
  return (
    <SectionPage
      number={6}
      title="Readings"
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
      references={[
        ...references,
        { no: 'Times', text: `as clocks in ${timeZone} show them; stored in UTC` },
        { no: 'Levels', text: levelUnit(project.units.length, project.verticalDatum) },
      ]}
      carried={carriedForward(loaderData)}
    >
      <ConflictPanel
        book={book}
        units={units}
        columns={{ instrument: instrumentColumns(units, pointNames) }}
      />
      <SiteDrawing
        features={features}
        selectedId={selectedId}
        onSelect={onSelect}
        hoveredId={hoveredId}
        onHover={onHover}
        planImage={shownPlan}
        lengthUnit={units.length}
        height={320}
        readOnly={!book.editable}
        onChange={place}
        onDraw={draw}
        tools={['instrument']}
      />
      <nav aria-label="Parts of this section" className="screen-only mb-3 flex flex-wrap gap-x-5 gap-y-1">
        {[
          { no: '6.1', title: 'Instruments', count: lines.length },
          { no: '6.2', title: 'Last readings', count: lines.filter((line) => line.last).length },
          { no: '6.3', title: 'Imports', count: imports.length },
        ].map(({ no, title, count }) => (
          <a key={no} href={`#s${no.replace('.', '-')}`}>
            <span className="mr-1 text-flint-2">{no}</span>
            {title} <span className="text-flint-2">{count}</span>
          </a>
        ))}
      </nav>
      <Heading no="6.1" aside="position, response zone, serial">
        Instruments
      </Heading>
      <InstrumentSheet
        book={book}
        units={units}
        points={pointNames}
        uses={uses}
        selectedId={selectedId}
        onSelect={onSelect}
        hoveredId={hoveredId}
        onHover={onHover}
      />
      <Heading no="6.2" aside="head = reference level in force − dip; course over the last year">
        Last readings
      </Heading>
      <InstrumentTable
        lines={lines}
        projectId={project.id}
        timeZone={timeZone}
        units={units}
        now={now}
        hoveredId={selectedId ?? hoveredId}
      />
      <Heading no="6.3" aside="every file is kept as it came, and can be undone whole">
        Imports
      </Heading>
      {mayImport && <Upload projectId={project.id} />}
      <div className="mt-3">
        <ImportList imports={imports} projectId={project.id} timeZone={timeZone} />
      </div>
    </SectionPage>
  )
}

function carriedForward({ lines, imports, project }: Route.ComponentProps['loaderData']): Carried[] {
  const readings = lines.reduce((sum, line) => sum + line.count, 0)
  const newest = lines.flatMap((line) => (line.last ? [line.last.at] : [])).sort()
  const latest = newest.at(-1)
  const without = lines.filter((line) => line.count > 0 && !line.lastHead)
  const waiting = imports.filter((one) => one.state === 'uploaded' || one.state === 'previewed')
  const committed = imports.filter((one) => one.state === 'committed').length
  const carried: Carried[] = [
    {
      label: 'Readings',
      value: formatNumber(readings, 0),
      note: `of ${lines.length} ${lines.length === 1 ? 'instrument' : 'instruments'}, from ${committed} ${committed === 1 ? 'file' : 'files'}`,
    },
  ]
  if (latest) {
    carried.push({ label: 'Newest reading', value: localTime(project.timeZone).day(latest) })
  }
  if (without.length > 0) {
    carried.push({
      label: 'Readings without a head',
      value: without.length,
      note: `${without
        .map((line) => line.name)
        .slice(0, 6)
        .join(', ')}: no reference level in force, or no number`,
      state: 'warn',
    })
  }
  if (waiting.length > 0) {
    carried.push({
      label: 'Files not committed yet',
      value: waiting.length,
      note: 'see 6.3',
      state: 'warn',
    })
  }
  return carried
}
