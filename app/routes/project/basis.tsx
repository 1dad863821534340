import { Link } from 'react-router'
import type { Assumption } from '~/basis/basis'
import { AssumptionSheet, basisColumns, basisRowId, basisSchemas, StandardSheet } from '~/basis/basis-sheets'
import { CheckButton } from '~/book/check-button'
import { ConflictPanel } from '~/book/conflict-panel'
import { referenceLines } from '~/book/references'
import { RowField } from '~/book/row-field'
import { listRows } from '~/book/rows.server'
import { SaveState } from '~/book/save-state'
import { sectionStatus } from '~/book/sections.server'
import { useRows } from '~/book/use-rows'
import { type Carried, Heading, SectionPage } from '~/components/section-page'
import { permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { shownUnit, unitLabel } from '~/units'
import { database } from '~database/connection.server'
import type { Route } from './+types/basis'

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const kinds = Object.keys(basisSchemas)
  const rows = await Promise.all(kinds.map((kind) => listRows(db, project.id, kind)))
  return {
    project,
    member: { userId: member.userId, mayEdit: can(member, 'edit', 'basis') },
    mayCheck: can(member, 'check', 'section'),
    status: await sectionStatus(db, project.id, 'basis'),
    rows: rows.flat(),
  }
}

export default function BasisPage({ loaderData }: Route.ComponentProps) {
  const { project, member, mayCheck, status, rows } = loaderData
  const { units } = project
  const book = useRows(rows, {
    projectId: project.id,
    userId: member.userId,
    schemas: basisSchemas,
    editable: member.mayEdit,
  })
  const assumptions = book.sound<Assumption>('assumption')
  const form = book.rows('basis').find((row) => row.id === basisRowId)
  const accuracy = String(form?.body.accuracy ?? '')
  const carried: Carried[] = [
    {
      label: 'Required accuracy',
      value: <span className="text-[1.1rem] whitespace-pre-line">{accuracy || '–'}</span>,
    },
    {
      label: 'Assumptions registered',
      value: assumptions.length,
      note: assumptions.some((row) => row.body.effect === '') ? 'some without an effect if wrong' : undefined,
      state: 'warn',
    },
  ]
  const fact = { book, kind: 'basis', id: basisRowId }
  return (
    <SectionPage
      number={1}
      title="Basis"
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
        '1.2',
        assumptions.map(({ body, recordedFrom }) => ({
          name: body.reference,
          source: body.source,
          recordedFrom,
        })),
        status.checkedAt,
      )}
      carried={carried}
    >
      <ConflictPanel book={book} units={units} columns={basisColumns} />
      <Heading no="1.1">Question and use</Heading>
      <div className="grid gap-4 lg:grid-cols-2">
        <div className="lg:col-span-2">
          <RowField {...fact} field="question" label="Question that the calculation answers" rows={3} />
        </div>
        <RowField
          {...fact}
          field="accuracy"
          label="Required accuracy of the answer"
          hint="With its unit: heads under the dig to ±0.1 m, say."
        />
        <RowField {...fact} field="intendedUse" label="Intended use" />
        <RowField {...fact} field="notFor" label="Not to be used for" />
        <RowField
          {...fact}
          field="idealisation"
          label="Idealisation"
          hint="What the ground and the water are taken to be, and what is left out."
        />
        <div className="lg:col-span-2">
          <RowField
            {...fact}
            field="conclusions"
            label="Conclusions"
            rows={3}
            hint="Written last; printed first in the package."
          />
        </div>
      </div>
      <Heading no="1.2">Assumptions register</Heading>
      <AssumptionSheet book={book} units={units} />
      <Heading no="1.3">Standards and guides used</Heading>
      <StandardSheet book={book} units={units} />
      <p className="text-[0.9rem] text-flint-2">
        Which edition governs is for local codes and the responsible engineer to say. Naming a standard here
        does not state that this calculation complies with it.
      </p>
      <Heading
        no="1.4"
        aside={<Link to={`/projects/${project.id}/settings`}>Change in the project settings</Link>}
      >
        Units and reference systems
      </Heading>
      <dl className="grid grid-cols-[auto_1fr] gap-x-6 gap-y-1 border border-rule px-3 py-2.5">
        <dt className="text-flint-2">Grid reference system</dt>
        <dd>EPSG:{project.crsEpsg}</dd>
        <dt className="text-flint-2">Levels above</dt>
        <dd>{project.verticalDatum}</dd>
        <dt className="text-flint-2">Time zone of the site</dt>
        <dd>{project.timeZone}</dd>
        <dt className="text-flint-2">Lengths and levels in</dt>
        <dd>{unitLabel(shownUnit('length', units))}</dd>
        <dt className="text-flint-2">Hydraulic conductivity in</dt>
        <dd>{unitLabel(shownUnit('conductivity', units))}</dd>
        <dt className="text-flint-2">Rates in</dt>
        <dd>{unitLabel(shownUnit('rate', units))}</dd>
      </dl>
    </SectionPage>
  )
}
