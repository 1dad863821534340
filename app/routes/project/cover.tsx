import { Link } from 'react-router'
import { CheckButton } from '~/book/check-button'
import { ConflictPanel } from '~/book/conflict-panel'
import { coverRowId, coverSchema } from '~/book/cover'
import { RowField } from '~/book/row-field'
import { listRows } from '~/book/rows.server'
import { SaveState } from '~/book/save-state'
import { type SectionStatus, sections } from '~/book/sections'
import { sectionStates } from '~/book/sections.server'
import { useRows } from '~/book/use-rows'
import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { Heading, SectionPage } from '~/components/section-page'
import type { SheetColumn } from '~/components/sheet-cells'
import { StateMark } from '~/components/state-mark'
import { listPackages } from '~/packages/packages.server'
import { permit } from '~/projects/guard.server'
import { listMembers } from '~/projects/members.server'
import { can, roleNames } from '~/projects/permissions'
import { database } from '~database/connection.server'
import type { Route } from './+types/cover'

const coverSchemas = { cover: coverSchema }

const coverColumns: SheetColumn[] = [
  { field: 'purposeOfIssue', label: 'Purpose of issue', editor: 'text' },
  { field: 'distribution', label: 'Distribution', editor: 'text' },
  { field: 'remarks', label: 'Remarks', editor: 'text' },
]

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'book')
  const db = database()
  const members = await listMembers(db, project.id)
  return {
    project,
    member: { userId: member.userId, mayEdit: can(member, 'edit', 'cover') },
    mayCheck: can(member, 'check', 'section'),
    states: await sectionStates(db, project.id),
    rows: await listRows(db, project.id, 'cover'),
    packages: (await listPackages(db, project.id)).map(
      ({ id, revision, status, purpose, issuedAt, signatures }) => ({
        id,
        revision,
        status,
        purpose,
        issuedAt,
        signatures,
      }),
    ),
    people: members
      .filter(({ role }) => role !== 'client')
      .map(({ userId, name, role }) => ({ userId, name, role: roleNames[role] })),
  }
}

export default function CoverPage({ loaderData }: Route.ComponentProps) {
  const { project, member, mayCheck, states, rows, packages, people } = loaderData
  const book = useRows(rows, {
    projectId: project.id,
    userId: member.userId,
    schemas: coverSchemas,
    editable: member.mayEdit,
  })
  const { day } = localTime(project.timeZone)
  const status = states[0] as SectionStatus
  const fact = { book, kind: 'cover', id: coverRowId }
  const changed = states.filter(({ state }) => state === 'changed since check').length
  const unchecked = states.filter(({ state }) => state === 'drafted').length
  const latest = packages[0]

  function signed(line: (typeof packages)[number], role: 'originator' | 'checker' | 'approver') {
    const signature = line.signatures.find((one) => one.role === role)
    return signature ? `${signature.name}, ${day(signature.at)}` : '–'
  }

  return (
    <SectionPage
      number={0}
      title="Cover"
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
        { no: '0.1', text: 'Project data come from the project settings.' },
        { no: '0.2', text: 'Revisions and signatures come from section 9.' },
      ]}
      carried={[
        {
          label: 'Current revision',
          value: latest?.revision ?? '–',
          note: latest?.status ?? 'no package has been made yet',
        },
        {
          label: 'Sections checked',
          value: `${states.filter(({ state }) => state === 'checked').length} of ${states.length}`,
          note:
            changed > 0
              ? `${changed} changed since check`
              : unchecked > 0
                ? `${unchecked} drafted, not checked yet`
                : undefined,
          state: changed > 0 ? 'alarm' : 'warn',
        },
      ]}
    >
      <ConflictPanel book={book} units={project.units} columns={{ cover: coverColumns }} />
      <div className="mb-6 border border-flint px-4 py-4 wide:px-6 wide:py-5">
        <p className="text-flint-2">Calculation package</p>
        <p className="mt-0.5 text-[1.6rem] leading-tight font-semibold">{project.title}</p>
        <dl className="mt-4 grid grid-cols-[auto_minmax(0,1fr)] gap-x-6 gap-y-1">
          {[
            ['Project no.', project.number],
            ['Client', project.client],
            ['Calc ref.', project.calcReference],
            ['Revision', latest ? `${latest.revision}, ${latest.status}` : 'none yet'],
          ].map(([label, value]) => (
            <div key={label} className="col-span-2 grid grid-cols-subgrid">
              <dt className="text-flint-2">{label}</dt>
              <dd className="font-semibold break-words">{value}</dd>
            </div>
          ))}
        </dl>
      </div>
      <Heading no="0.1">Issue</Heading>
      <div className="grid gap-4 lg:grid-cols-2">
        <RowField
          {...fact}
          field="purposeOfIssue"
          label="Purpose of issue"
          hint="For comment, for construction …"
        />
        <RowField
          {...fact}
          field="distribution"
          label="Distribution"
          hint="Who receives the issued package."
        />
        <div className="lg:col-span-2">
          <RowField {...fact} field="remarks" label="Remarks on the cover" />
        </div>
      </div>
      <Heading no="0.2" aside={<Link to={`/projects/${project.id}/package`}>To the package</Link>}>
        Revisions and sign-off
      </Heading>
      <DataTable
        caption="Revisions and sign-off"
        rows={packages}
        rowKey={(line) => line.id}
        empty="No revision yet. The first one is made in section 9 and becomes P01."
        columns={[
          { head: 'Rev.', cell: (line) => line.revision },
          { head: 'Status', cell: (line) => line.status, words: true },
          { head: 'Purpose', cell: (line) => line.purpose, words: true },
          { head: 'Made', cell: (line) => signed(line, 'originator'), words: true },
          { head: 'Checked', cell: (line) => signed(line, 'checker'), words: true },
          { head: 'Approved', cell: (line) => signed(line, 'approver'), words: true },
          { head: 'Issued', cell: (line) => (line.issuedAt ? day(line.issuedAt) : '–'), words: true },
        ]}
      />
      <Heading no="0.3">State of the sections</Heading>
      <DataTable
        caption="State of the sections"
        rows={states}
        rowKey={(line) => line.key}
        columns={[
          { head: 'Section', cell: (line) => <SectionLink projectId={project.id} line={line} /> },
          {
            head: 'State',
            words: true,
            cell: (line) => (
              <span className="inline-flex items-center gap-1.5">
                <StateMark state={line.state} /> {line.state}
              </span>
            ),
          },
          {
            head: 'Last change',
            words: true,
            cell: (line) => (line.changedAt ? day(line.changedAt.toISOString()) : '–'),
          },
          {
            head: 'Checked by',
            words: true,
            cell: (line) =>
              line.checkedBy && line.checkedAt
                ? `${line.checkedBy}, ${day(line.checkedAt.toISOString())}`
                : '–',
          },
        ]}
      />
      <Heading no="0.4" aside="a checker or approver is never the originator">
        People
      </Heading>
      <DataTable
        caption="People of this project"
        rows={people}
        rowKey={(person) => person.userId}
        columns={[
          { head: 'Name', cell: (person) => person.name },
          { head: 'Role', cell: (person) => person.role, words: true },
        ]}
      />
    </SectionPage>
  )
}

function SectionLink({ projectId, line }: { projectId: number; line: SectionStatus }) {
  const section = sections.find(({ key }) => key === line.key)
  return (
    <Link to={`/projects/${projectId}/${line.key}`}>
      <span className="mr-2 font-normal text-flint-2">{section?.number}</span>
      {section?.title}
    </Link>
  )
}
