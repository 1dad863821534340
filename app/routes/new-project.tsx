import { useForm } from '@conform-to/react'
import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, href, redirect, useNavigation } from 'react-router'
import { Button, LinkButton } from '~/components/button'
import { FormMessage } from '~/components/form-message'
import { PageTitle } from '~/components/page-title'
import { projectSchema } from '~/projects/project'
import { ProjectFieldset } from '~/projects/project-form'
import { createProject, isNumberTaken, justCreated } from '~/projects/projects.server'
import { requireAdministrator } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/new-project'

export async function loader({ context }: Route.LoaderArgs) {
  requireAdministrator(context)
  return { timeZones: Intl.supportedValuesOf('timeZone') }
}

export async function action({ context, request }: Route.ActionArgs) {
  const { userId } = requireAdministrator(context)
  const submission = parseWithZod(await request.formData(), { schema: projectSchema })
  if (submission.status !== 'success') return data(submission.reply(), 400)
  const db = database()
  try {
    const projectId = await createProject(db, submission.value, userId)
    return redirect(href('/projects/:projectId/settings', { projectId: String(projectId) }))
  } catch (error) {
    if (!isNumberTaken(error)) throw error
    // A double click sends the form twice: the second one finds what the first one made.
    const same = await justCreated(db, submission.value.number, userId)
    if (same) return redirect(href('/projects/:projectId/settings', { projectId: String(same) }))
    return data(submission.reply({ fieldErrors: { number: ['Another project has this number.'] } }), 400)
  }
}

export default function NewProject({ loaderData, actionData }: Route.ComponentProps) {
  const [form, fields] = useForm({
    lastResult: actionData,
    defaultValue: { timeZone: 'Europe/London', lengthUnit: 'm', timeUnit: 'd' },
    onValidate: ({ formData }) => parseWithZod(formData, { schema: projectSchema }),
    shouldRevalidate: 'onInput',
  })
  const isBusy = useNavigation().state !== 'idle'
  return (
    <div className="max-w-3xl">
      <PageTitle title="New project" />
      <p className="mb-5 text-flint-2">
        You become its project manager, and invite the others on the next page.
      </p>
      <FormMessage result={actionData} />
      <Form method="post" id={form.id} onSubmit={form.onSubmit} noValidate>
        <ProjectFieldset fields={fields} timeZones={loaderData.timeZones} />
        <div className="mt-6 flex gap-3">
          <Button type="submit" look="primary" disabled={isBusy}>
            Create the project
          </Button>
          <LinkButton to={href('/projects')}>Cancel</LinkButton>
        </div>
      </Form>
    </div>
  )
}
