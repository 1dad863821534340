import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, href, Link, useNavigation } from 'react-router'
import { z } from 'zod'
import { Button, LinkButton } from '~/components/button'
import { DataTable } from '~/components/data-table'
import { FormMessage } from '~/components/form-message'
import { PageTitle } from '~/components/page-title'
import { appointManager, mailInvitation } from '~/projects/members.server'
import { listPeople } from '~/projects/people.server'
import { roleNames } from '~/projects/permissions'
import { allProjects, findProject, projectsOf } from '~/projects/projects.server'
import { requireAdministrator, signedInContext } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/projects'

export async function loader({ context }: Route.LoaderArgs) {
  const db = database()
  const user = context.get(signedInContext)
  const mine = await projectsOf(db, user.userId)
  return {
    mine: mine.map(({ id, number, title, client, stage, role }) => ({
      id,
      number,
      title,
      client,
      stage,
      role,
    })),
    firm: user.isAdministrator
      ? {
          projects: await allProjects(db),
          people: (await listPeople(db))
            .filter((person) => !person.leftAt)
            .map(({ id, name, email }) => ({ id, name, email })),
        }
      : undefined,
  }
}

const appointSchema = z.object({
  intent: z.literal('appoint'),
  projectId: z.coerce.number().int().positive(),
  userId: z.coerce.number({ error: 'Choose a person.' }).int().positive('Choose a person.'),
})

/** An administrator puts somebody in charge of a project. */
export async function action({ context, request }: Route.ActionArgs) {
  const user = requireAdministrator(context)
  const submission = parseWithZod(await request.formData(), { schema: appointSchema })
  if (submission.status !== 'success')
    return data(submission.reply({ formErrors: ['Choose a person.'] }), 400)
  const { projectId, userId } = submission.value
  const db = database()
  const project = await findProject(db, projectId)
  if (!project) return data(submission.reply({ formErrors: ['There is no such project.'] }), 404)
  const refusal = await appointManager(db, projectId, userId, user.userId)
  if (refusal) return data(submission.reply({ formErrors: ['This person has left the firm.'] }), 400)
  await mailInvitation(db, projectId, userId, user.name)
  return { ...submission.reply(), done: `${project.number} has its project manager; a mail tells them.` }
}

export default function Projects({ loaderData, actionData }: Route.ComponentProps) {
  const { mine, firm } = loaderData
  return (
    <>
      <PageTitle
        title="Projects"
        actions={
          firm && (
            <LinkButton look="primary" to={href('/projects/new')}>
              New project
            </LinkButton>
          )
        }
      />
      <FormMessage result={actionData} />
      <DataTable
        caption="My projects"
        rows={mine}
        rowKey={(project) => project.id}
        empty={
          firm
            ? 'You are a member of no project. As an administrator you can make one.'
            : 'You are a member of no project yet. A project manager can invite you.'
        }
        columns={[
          {
            head: 'Number',
            cell: (project) => (
              <Link to={href('/projects/:projectId', { projectId: String(project.id) })}>
                {project.number}
              </Link>
            ),
          },
          {
            head: 'Title',
            words: true,
            cell: (project) => (
              <Link
                to={href('/projects/:projectId', { projectId: String(project.id) })}
                className="font-semibold"
              >
                {project.title}
              </Link>
            ),
          },
          { head: 'Client', words: true, cell: (project) => project.client },
          { head: 'Stage', words: true, cell: (project) => project.stage || '–' },
          { head: 'You are', words: true, cell: (project) => roleNames[project.role] },
        ]}
      />
      {firm && (
        <section className="mt-10">
          <h2 className="text-[1.15rem] font-semibold">All projects of the firm</h2>
          <p className="mb-3 max-w-prose text-flint-2">
            As an administrator you can put somebody in charge of a project. Its calc book opens to its
            members only.
          </p>
          <DataTable
            caption="All projects of the firm"
            rows={firm.projects}
            rowKey={(project) => project.id}
            columns={[
              { head: 'Number', cell: (project) => project.number },
              { head: 'Title', words: true, cell: (project) => project.title },
              {
                head: 'Project manager',
                words: true,
                cell: (project) => project.managers.join(', ') || 'nobody',
              },
              {
                head: 'Appoint',
                words: true,
                cell: (project) => <Appoint project={project} people={firm.people} />,
              },
            ]}
          />
        </section>
      )}
    </>
  )
}

function Appoint({
  project,
  people,
}: {
  project: { id: number; number: string }
  people: { id: number; name: string; email: string }[]
}) {
  const isBusy = useNavigation().state !== 'idle'
  return (
    <Form method="post" className="flex gap-2">
      <input type="hidden" name="projectId" value={project.id} />
      <select
        name="userId"
        required
        defaultValue=""
        aria-label={`Project manager of ${project.number}`}
        className="max-w-56 min-w-36 rounded border border-rule bg-chalk px-2 py-1"
      >
        <option value="" disabled>
          choose a person
        </option>
        {people.map((person) => (
          <option key={person.id} value={person.id}>
            {person.name} ({person.email})
          </option>
        ))}
      </select>
      <Button type="submit" name="intent" value="appoint" disabled={isBusy}>
        Appoint
      </Button>
    </Form>
  )
}
