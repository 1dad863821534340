import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, href, Link, useNavigation } from 'react-router'
import { z } from 'zod'
import { Button, LinkButton } from '~/components/button'
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
      {mine.length === 0 && (
        <p className="border border-rule bg-chalk-2 px-3 py-2.5 text-flint-2">
          {firm
            ? 'You are a member of no project. As an administrator you can make one.'
            : 'You are a member of no project yet. A project manager can invite you.'}
        </p>
      )}
      <ul className="border-t border-rule empty:border-0">
        {mine.map((project) => (
          <li
            key={project.id}
            className="grid gap-x-6 gap-y-0.5 border-b border-rule py-3 sm:grid-cols-[9rem_1fr_auto]"
          >
            <p className="break-words text-flint-2">{project.number}</p>
            <div className="min-w-0">
              <h2 className="text-[1.15rem] leading-snug font-semibold">
                <Link to={href('/projects/:projectId', { projectId: String(project.id) })}>
                  {project.title}
                </Link>
              </h2>
              <p>{project.client}</p>
              {project.stage && <p className="text-flint-2">{project.stage}</p>}
            </div>
            <p className="text-flint-2">{roleNames[project.role]}</p>
          </li>
        ))}
      </ul>
      {firm && (
        <section className="mt-10">
          <h2 className="text-[1.15rem] font-semibold">All projects of the firm</h2>
          <p className="mb-3 max-w-prose text-flint-2">
            As an administrator you can put somebody in charge of a project. Its calc book opens to its
            members only.
          </p>
          <ul className="border-t border-rule empty:border-0">
            {firm.projects.map((project) => (
              <li
                key={project.id}
                className="grid items-start gap-x-6 gap-y-1 border-b border-rule py-2.5 sm:grid-cols-[9rem_1fr_auto]"
              >
                <p className="break-words text-flint-2">{project.number}</p>
                <div>
                  <p className="font-semibold">{project.title}</p>
                  <p className="text-flint-2">
                    {project.managers.length > 0
                      ? `in charge: ${project.managers.join(', ')}`
                      : 'nobody is in charge'}
                  </p>
                </div>
                <Appoint project={project} people={firm.people} />
              </li>
            ))}
          </ul>
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
