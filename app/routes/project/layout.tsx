import { Form, href, Link, NavLink, Outlet, useLocation } from 'react-router'
import { sections } from '~/book/sections'
import { sectionStates } from '~/book/sections.server'
import { Spine } from '~/components/spine'
import { TitleBlock } from '~/components/title-block'
import type { Signature } from '~/packages/title-block'
import { titleBlockFacts } from '~/packages/title-block.server'
import { findMembership, membershipContext } from '~/projects/guard.server'
import { can, roleNames } from '~/projects/permissions'
import { requireSignIn } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/layout'

export const middleware: Route.MiddlewareFunction[] = [
  requireSignIn,
  async ({ context, params }, next) => {
    context.set(membershipContext, await findMembership(context, params.projectId))
    return next()
  },
]

/** A client gets the name of the project and nothing of the book. */
export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = context.get(membershipContext)
  const person = { name: member.name, role: roleNames[member.role] }
  if (!can(member, 'view', 'book')) {
    return {
      view: 'client' as const,
      person,
      project: { id: project.id, number: project.number, title: project.title },
    }
  }
  const db = database()
  return {
    view: 'team' as const,
    person,
    project: {
      id: project.id,
      number: project.number,
      title: project.title,
      calcReference: project.calcReference,
      timeZone: project.timeZone,
    },
    states: await sectionStates(db, project.id),
    titleBlock: await titleBlockFacts(db, project.id),
  }
}

function initials(name: string): string {
  return name
    .split(/\s+/)
    .map((word) => word[0] ?? '')
    .join('')
    .toUpperCase()
}

function signed(signatures: Signature[], role: Signature['role'], timeZone: string) {
  const signature = signatures.find((s) => s.role === role)
  if (!signature) return <span className="font-normal text-flint-2">–</span>
  const day = new Intl.DateTimeFormat('en-GB', { day: 'numeric', month: 'short', timeZone })
  return `${initials(signature.name)} ${day.format(new Date(signature.at))}`
}

function Person({ person }: { person: { name: string; role: string } }) {
  return (
    <div className="flex items-center gap-3 text-[0.93rem] wide:block">
      <p className="leading-tight">
        {person.name}
        <small className="block text-flint-2">{person.role}</small>
      </p>
      <div className="flex flex-wrap items-center gap-x-3 wide:mt-2">
        <Link to={href('/projects')}>Projects</Link>
        <Link to={href('/account')}>Account</Link>
        <Form method="post" action={href('/sign-out')} reloadDocument>
          <button type="submit" className="text-bourne hover:underline">
            Sign out
          </button>
        </Form>
      </div>
    </div>
  )
}

export default function ProjectLayout({ loaderData, params }: Route.ComponentProps) {
  const location = useLocation()
  const { projectId } = params
  if (loaderData.view === 'client') {
    return (
      <div className="mx-auto flex min-h-dvh max-w-5xl flex-col">
        <header className="flex flex-wrap items-center justify-between gap-3 border-b-[1.5px] border-flint px-4 py-3">
          <p className="text-[1.27rem] font-bold">Lavant</p>
          <Person person={loaderData.person} />
        </header>
        <Outlet />
      </div>
    )
  }
  const { project, states, titleBlock, person } = loaderData
  const base = `/projects/${projectId}`
  const current = sections.find((section) => location.pathname.startsWith(`${base}/${section.key}`))
  const entries = sections.map((section) => ({
    number: section.number,
    title: section.title,
    to: `${base}/${section.key}`,
    state: states.find((s) => s.key === section.key)?.state ?? ('empty' as const),
  }))
  const reopened = states.filter((s) => s.state === 'changed since check').length
  return (
    <div className="flex min-h-dvh flex-col wide:grid wide:grid-cols-[11.5rem_minmax(0,1fr)]">
      <a href="#work" className="absolute -left-[999px] z-50 bg-chalk p-2 focus:top-2 focus:left-2">
        Skip to the work
      </a>
      <Spine entries={entries} home={{ to: href('/projects'), label: 'Lavant: all projects' }}>
        <div className="hidden border-t border-rule px-4.5 py-3 wide:block">
          <ul className="mb-3 text-[0.93rem]">
            {[
              ['progress', 'Progress'],
              ['history', 'History'],
              ['settings', 'Project settings'],
            ].map(([path, label]) => (
              <li key={path}>
                <NavLink to={`${base}/${path}`} className="aria-[current=page]:font-semibold">
                  {label}
                </NavLink>
              </li>
            ))}
          </ul>
          <Person person={person} />
        </div>
      </Spine>
      <div className="flex min-w-0 flex-1 flex-col">
        <TitleBlock
          cells={[
            { label: 'Project', value: project.title, wide: true },
            { label: 'Calc ref.', value: project.calcReference },
            {
              label: 'Revision',
              value: titleBlock.revision ? (
                <>
                  {titleBlock.revision} <span className="font-normal text-ochre">{titleBlock.status}</span>
                </>
              ) : (
                <span className="font-normal text-flint-2">none yet</span>
              ),
            },
            { label: 'Made', value: signed(titleBlock.signatures, 'originator', project.timeZone) },
            {
              label: 'Checked',
              value:
                reopened > 0 ? (
                  <span className="font-normal text-madder">{reopened} reopened</span>
                ) : (
                  signed(titleBlock.signatures, 'checker', project.timeZone)
                ),
            },
            { label: 'Approved', value: signed(titleBlock.signatures, 'approver', project.timeZone) },
            { label: 'Section', value: current ? `${current.number} of ${sections.length - 1}` : '–' },
          ]}
        />
        <Outlet />
        <footer className="screen-only border-t border-rule px-4 py-4 wide:hidden">
          <ul className="mb-3 flex gap-4 text-[0.93rem]">
            <li>
              <Link to={`${base}/progress`}>Progress</Link>
            </li>
            <li>
              <Link to={`${base}/history`}>History</Link>
            </li>
            <li>
              <Link to={`${base}/settings`}>Project settings</Link>
            </li>
          </ul>
          <Person person={person} />
        </footer>
      </div>
    </div>
  )
}
