import { useMemo, useState } from 'react'
import { z } from 'zod'
import { CheckButton } from '~/book/check-button'
import { ConflictPanel } from '~/book/conflict-panel'
import { placeSchemas } from '~/book/field'
import { referenceLines } from '~/book/references'
import { listRows, listUses } from '~/book/rows.server'
import { SaveState } from '~/book/save-state'
import { sectionStatus } from '~/book/sections.server'
import { useRows } from '~/book/use-rows'
import { Notice } from '~/components/notice'
import { type Carried, Heading, SectionPage } from '~/components/section-page'
import type { DrawnGeometry } from '~/ground/drawing/drawn-feature'
import { pointFeatures, zoneFeatures } from '~/ground/drawn-features'
import { type Material, type PlanImage, type Point, planImageSchema, type Zone } from '~/ground/ground'
import {
  groundColumns,
  groundSchemas,
  MaterialSheet,
  newGroundRow,
  PointSheet,
  ZoneSheet,
} from '~/ground/ground-sheets'
import { PlanImageForm } from '~/ground/plan-image-form'
import { SiteDrawing } from '~/ground/site-drawing'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { rowKinds } from '~/row-kinds.server'
import { convert, formatNumber, type Quantity, shownUnit, type UnitName, unitLabel } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/ground'

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const kinds = Object.keys(groundSchemas)
  const rows = await Promise.all(kinds.map((kind) => listRows(db, project.id, kind)))
  return {
    project,
    member: { userId: member.userId, mayEdit: can(member, 'edit', 'ground') },
    mayCheck: can(member, 'check', 'section'),
    status: await sectionStatus(db, project.id, 'ground'),
    rows: rows.flat(),
    uses: await listUses(db, project.id, rowKinds),
  }
}

/** A project has one plan image: the id of its row is fixed, so that two people who add one meet in it. */
const planImageRowId = 'plan-image'

const anyRow = z.looseObject({})

/** The fields of a zone or point that say where it lies, as drawn. */
function placeOf(geometry: DrawnGeometry): Record<string, unknown> {
  return geometry.type === 'point' ? { x: geometry.at[0], y: geometry.at[1] } : { polygon: geometry.vertices }
}

function span(quantities: Quantity[], unit: UnitName): string {
  const values = quantities.map((quantity) => convert(quantity, unit))
  const [low, high] = [Math.min(...values), Math.max(...values)]
  return low === high ? formatNumber(low) : `${formatNumber(low)} – ${formatNumber(high)}`
}

export default function GroundPage({ loaderData }: Route.ComponentProps) {
  const { project, member, mayCheck, status, rows, uses } = loaderData
  const { units } = project
  const book = useRows(rows, {
    projectId: project.id,
    userId: member.userId,
    schemas: groundSchemas,
    editable: member.mayEdit,
  })
  const [selectedId, onSelect] = useState<string | null>(null)
  const [hoveredId, onHover] = useState<string | null>(null)
  const shared = { selectedId, onSelect, hoveredId, onHover }
  const [held, setHeld] = useState<string | null>(null)
  const features = useMemo(
    () => [
      ...zoneFeatures(
        book.placed<Zone>('zone', placeSchemas.polygon),
        book.placed<Material>('material', anyRow),
      ),
      ...pointFeatures(book.placed<Point>('point', placeSchemas.point)),
    ],
    [book],
  )

  const [planRow] = book.rows('plan image')
  const planBody = planRow?.body
  const planImage = useMemo(() => planImageSchema.safeParse(planBody).data ?? null, [planBody])
  const fileAddress = (fileId: number) => `/projects/${project.id}/files/${fileId}`
  const shownPlan = useMemo(
    () => planImage && { ...planImage, url: `/projects/${project.id}/files/${planImage.fileId}` },
    [planImage, project.id],
  )

  function savePlan(body: PlanImage) {
    if (planRow) book.set(planRow.id, { ...body })
    else book.apply([{ op: 'add', id: planImageRowId, kind: 'plan image', body: { ...body }, cells: {} }])
  }

  function draw(kind: string, geometry: DrawnGeometry) {
    if (kind !== 'zone' && kind !== 'point') return
    const id = crypto.randomUUID()
    const body = { ...newGroundRow(kind, book), ...placeOf(geometry) }
    book.apply([{ op: 'add', id, kind, body, cells: {} }])
    onSelect(id)
  }

  function remove(id: string) {
    if (uses[id]?.length) setHeld(id)
    else book.apply([{ op: 'delete', id }])
  }

  const materials = book.sound<Material>('material')
  const zones = book.sound<Zone>('zone')
  const points = book.sound<Point>('point')
  const sourced = [
    { no: '2.1', rows: materials },
    { no: '2.2', rows: zones },
    { no: '2.3', rows: points },
  ].flatMap(({ no, rows: list }) =>
    referenceLines(
      no,
      list.map(({ body, recordedFrom }) => ({ name: body.name, source: body.source, recordedFrom })),
      status.checkedAt,
    ),
  )
  const sheet = { book, units, shared, uses }
  return (
    <SectionPage
      number={2}
      title="Ground"
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
      references={sourced}
      carried={carriedForward(materials, zones, points.length, units)}
    >
      <ConflictPanel book={book} units={units} columns={groundColumns(book, units)} />
      <SiteDrawing
        features={features}
        {...shared}
        planImage={shownPlan}
        lengthUnit={units.length}
        height={520}
        readOnly={!book.editable}
        onChange={(id, geometry) => book.set(id, placeOf(geometry))}
        onDraw={draw}
        onDelete={remove}
        tools={['zone', 'point']}
      />
      {held && (
        <Notice tone="warn" live title="This row is used elsewhere.">
          {uses[held]?.map((use) => use.words).join(', ')}. Choose it in the sheet to delete it, which says
          what can be done.
        </Notice>
      )}
      <Heading no="2.1" aside="hydraulic conductivity K (permeability k)">
        Materials
      </Heading>
      <MaterialSheet {...sheet} />
      <Heading no="2.2" aside="a zone further down replaces those above it">
        Zones
      </Heading>
      <ZoneSheet {...sheet} />
      <Heading no="2.3">Named points</Heading>
      <PointSheet {...sheet} />
      <div className="screen-only">
        <Heading no="2.4" aside="a picture of the site under the drawing, placed by two known points">
          Plan image
        </Heading>
        {planImage || book.editable ? (
          <PlanImageForm
            key={planRow ? planRow.id : 'none'}
            planImage={planImage}
            uploadAddress={`/projects/${project.id}/files`}
            fileAddress={fileAddress}
            lengthUnit={units.length}
            readOnly={!book.editable}
            onSave={savePlan}
            onRemove={planRow && (() => book.apply([{ op: 'delete', id: planRow.id }]))}
          />
        ) : (
          <p className="text-flint-2">No plan image.</p>
        )}
      </div>
    </SectionPage>
  )
}

function carriedForward(
  materials: { body: Material }[],
  zones: { body: Zone }[],
  pointCount: number,
  units: Parameters<typeof shownUnit>[1],
): Carried[] {
  const conductivity = shownUnit('conductivity', units)
  const carried: Carried[] = materials.map(({ body }) => ({
    label: `K, ${body.name}`,
    value: span([body.kx, body.ky], conductivity),
    unit: unitLabel(conductivity),
    note:
      body.kLow && body.kHigh
        ? `range ${span([body.kLow, body.kHigh], conductivity)}`
        : 'no range given: nothing can be said about its effect',
    state: body.kLow && body.kHigh ? undefined : 'warn',
  }))
  if (zones.length > 0) {
    const length = shownUnit('length', units)
    carried.push({
      label: 'Base level of zones',
      value: span(
        zones.map((zone) => zone.body.base),
        length,
      ),
      unit: unitLabel(length),
      note: '→ 4',
    })
  }
  carried.push({ label: 'Named points', value: pointCount, note: '→ 5 heads, 6 instruments' })
  return carried
}
