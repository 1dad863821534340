import { useMemo, useState } from 'react'
import { CheckButton } from '~/book/check-button'
import { ConflictPanel } from '~/book/conflict-panel'
import { placeSchemas } from '~/book/field'
import { referenceLines } from '~/book/references'
import { listRows, listUses } from '~/book/rows.server'
import { SaveState } from '~/book/save-state'
import { sectionStatus } from '~/book/sections.server'
import { type RowsEditor, useRows } from '~/book/use-rows'
import { Notice } from '~/components/notice'
import { type Carried, Heading, SectionPage } from '~/components/section-page'
import type { DrawnFeature, DrawnGeometry } from '~/ground/drawing/drawn-feature'
import { pointFeatures, zoneFeatures } from '~/ground/drawn-features'
import type { PlanImage, Point, Zone } from '~/ground/ground'
import { SiteDrawing } from '~/ground/site-drawing'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { rowKinds } from '~/row-kinds.server'
import { formatNumber, type ProjectUnits, unitLabel } from '~/units'
import {
  boundaryFeatures,
  rechargeZoneFeatures,
  wallFeatures,
  wellFeatures,
  withBoundaryGeometry,
} from '~/water/drawn-features'
import { type WaterTotals, waterTotals } from '~/water/totals'
import type { Boundary, RechargeZone, Wall, Well } from '~/water/water'
import {
  BoundarySheet,
  newWaterRow,
  RechargeSheet,
  WallSheet,
  type WaterKind,
  WellSheet,
  waterColumns,
  waterSchemas,
} from '~/water/water-sheets'
import { database } from '~database/connection.server'
import type { Route } from './+types/water'

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const kinds = Object.keys(waterSchemas)
  const rows = await Promise.all(kinds.map((kind) => listRows(db, project.id, kind)))
  return {
    project,
    member: { userId: member.userId, mayEdit: can(member, 'edit', 'water') },
    mayCheck: can(member, 'check', 'section'),
    status: await sectionStatus(db, project.id, 'water'),
    rows: rows.flat(),
    zones: await listRows<Zone>(db, project.id, 'zone'),
    points: await listRows<Point>(db, project.id, 'point'),
    planImage: (await listRows<PlanImage>(db, project.id, 'plan image'))[0]?.body ?? null,
    uses: await listUses(db, project.id, rowKinds),
  }
}

export default function WaterPage({ loaderData }: Route.ComponentProps) {
  const { project, member, mayCheck, status, rows, zones, points, planImage, uses } = loaderData
  const { units } = project
  const book = useRows(rows, {
    projectId: project.id,
    userId: member.userId,
    schemas: waterSchemas,
    editable: member.mayEdit,
  })
  const [selectedId, onSelect] = useState<string | null>(null)
  const [hoveredId, onHover] = useState<string | null>(null)
  const shared = { selectedId, onSelect, hoveredId, onHover }
  const [held, setHeld] = useState<string | null>(null)
  const features = useMemo(
    () => [
      ...[...zoneFeatures(zones), ...pointFeatures(points)].map((feature) => ({ ...feature, muted: true })),
      ...waterFeatures(book),
    ],
    [book, zones, points],
  )

  const shownPlan = useMemo(
    () => planImage && { ...planImage, url: `/projects/${project.id}/files/${planImage.fileId}` },
    [planImage, project.id],
  )

  function draw(kind: string, geometry: DrawnGeometry) {
    if (!isWaterKind(kind)) return
    const id = crypto.randomUUID()
    const body = { ...newWaterRow(kind, book), ...placeOf(kind, geometry, {}) }
    book.apply([{ op: 'add', id, kind, body, cells: {} }])
    onSelect(id)
  }

  function place(id: string, geometry: DrawnGeometry) {
    const row = (Object.keys(waterSchemas) as WaterKind[])
      .flatMap((kind) => book.rows(kind))
      .find((one) => one.id === id)
    if (row && isWaterKind(row.kind)) book.set(id, placeOf(row.kind, geometry, row.body))
  }

  function remove(id: string) {
    if (uses[id]?.length) setHeld(id)
    else book.apply([{ op: 'delete', id }])
  }

  const wells = book.sound<Well>('well')
  const rechargeZones = book.sound<RechargeZone>('recharge zone')
  const boundaries = book.sound<Boundary>('boundary')
  const walls = book.sound<Wall>('wall')
  const parts = [
    { no: '3.1', title: 'Wells', rows: wells },
    { no: '3.2', title: 'Recharge zones', rows: rechargeZones },
    { no: '3.3', title: 'Boundaries', rows: boundaries },
    { no: '3.4', title: 'Cut-off walls', rows: walls },
  ]
  const references = parts.flatMap(({ no, rows: list }) =>
    referenceLines(
      no,
      list.map(({ body, recordedFrom }) => ({ name: body.name, source: body.source, recordedFrom })),
      status.checkedAt,
    ),
  )
  const totals = waterTotals({ wells, rechargeZones, boundaries, walls }, units)
  const sheet = { book, units, shared, uses }
  return (
    <SectionPage
      number={3}
      title="Water"
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
      references={references}
      carried={carriedForward(totals, units)}
    >
      <ConflictPanel book={book} units={units} columns={waterColumns(units.length)} />
      <SiteDrawing
        features={features}
        {...shared}
        planImage={shownPlan}
        lengthUnit={units.length}
        height={520}
        readOnly={!book.editable}
        onChange={place}
        onDraw={draw}
        onDelete={remove}
        tools={['well', 'recharge zone', 'boundary', 'wall']}
      />
      {held && (
        <Notice tone="warn" live title="This row is used elsewhere.">
          {uses[held]?.map((use) => use.words).join(', ')}. Choose it in the sheet and delete it there, which
          takes it out of those too.
        </Notice>
      )}
      <nav aria-label="Parts of this section" className="screen-only my-4 flex flex-wrap gap-x-5 gap-y-1">
        {parts.map(({ no, title, rows: list }) => (
          <a key={no} href={`#s${no.replace('.', '-')}`}>
            <span className="mr-1 text-flint-2">{no}</span>
            {title} <span className="text-flint-2">{list.length}</span>
          </a>
        ))}
      </nav>
      <Heading no="3.1" aside="the kind says which way the water goes: rates carry no sign">
        Wells
      </Heading>
      <WellSheet {...sheet} zones={zones} />
      <Heading no="3.2">Recharge zones</Heading>
      <RechargeSheet {...sheet} />
      <Volumes totals={totals} units={units} />
      <Heading no="3.3" aside="an edge without a boundary lets no water through">
        Boundaries
      </Heading>
      <BoundarySheet {...sheet} />
      <Heading no="3.4">Cut-off walls</Heading>
      <WallSheet {...sheet} />
    </SectionPage>
  )
}

function isWaterKind(kind: string): kind is WaterKind {
  return Object.hasOwn(waterSchemas, kind)
}

function waterFeatures(book: RowsEditor): DrawnFeature[] {
  return [
    ...rechargeZoneFeatures(book.placed<RechargeZone>('recharge zone', placeSchemas.polygon)),
    ...boundaryFeatures(book.placed<Boundary>('boundary', placeSchemas.line)),
    ...wallFeatures(book.placed<Wall>('wall', placeSchemas.line)),
    ...wellFeatures(book.placed<Well>('well', placeSchemas.point)),
  ]
}

/** The fields of a row that say where it lies, as drawn. */
function placeOf(
  kind: WaterKind,
  geometry: DrawnGeometry,
  body: Record<string, unknown>,
): Record<string, unknown> {
  if (geometry.type === 'polygon') return { polygon: geometry.vertices }
  if (geometry.type === 'point') {
    const [x, y] = geometry.at
    return { x, y }
  }
  if (kind !== 'boundary' || !body.line) return { line: geometry.vertices }
  const { line, levels } = withBoundaryGeometry(body as Boundary, geometry)
  return { line, levels }
}

function Volumes({ totals, units }: { totals: WaterTotals; units: ProjectUnits }) {
  if (totals.volumes.length === 0) return null
  const area = units.length === 'm' ? 'm²' : 'ft²'
  return (
    <p className="text-[0.93rem] text-flint-2">
      {totals.volumes.map((zone) => (
        <span key={zone.id} className="mr-4 inline-block">
          <b className="font-semibold text-flint">{zone.name}</b>{' '}
          {zone.area === null
            ? 'lies everywhere: its volume follows from the grid of a case'
            : `${formatNumber(zone.area)} ${area} gives ${formatNumber(zone.volume)} ${unitLabel(totals.unit)}`}
        </span>
      ))}
    </p>
  )
}

function counted(count: number, noun: string): string {
  return `${count} ${noun}${count === 1 ? '' : 's'}`
}

function carriedForward(totals: WaterTotals, units: ProjectUnits): Carried[] {
  const unit = unitLabel(totals.unit)
  const known = totals.volumes.filter((zone) => zone.volume !== null)
  const carried: Carried[] = [
    {
      label: 'Total abstraction',
      value: formatNumber(totals.abstraction),
      unit,
      note: counted(totals.abstractionWells, 'abstraction well'),
    },
    {
      label: 'Total by recharge wells',
      value: formatNumber(totals.recharge),
      unit,
      note: counted(totals.rechargeWells, 'recharge well'),
    },
    {
      label: 'Recharge of outlined zones',
      value: formatNumber(known.reduce((total, zone) => total + (zone.volume ?? 0), 0)),
      unit,
      note:
        known.length < totals.volumes.length
          ? 'a zone that lies everywhere is not in this sum'
          : 'area × rate',
    },
  ]
  if (totals.specifiedFlux !== 0) {
    carried.push({
      label: 'Specified fluxes',
      value: formatNumber(Math.abs(totals.specifiedFlux)),
      unit,
      note: totals.specifiedFlux > 0 ? 'into the model' : 'out of the model',
    })
  }
  if (totals.wallLength > 0) {
    carried.push({ label: 'Length of walls', value: formatNumber(totals.wallLength), unit: units.length })
  }
  return carried
}
