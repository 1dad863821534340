import { data, Form, href, redirect, useNavigation } from 'react-router'
import { Button } from '~/components/button'
import { DataTable } from '~/components/data-table'
import { FormMessage } from '~/components/form-message'
import { localTime } from '~/components/local-time'
import { PageTitle } from '~/components/page-title'
import { ThemeChoice } from '~/components/theme-choice'
import { sessionContext, signedInContext } from '~/sign-in/guard.server'
import { endSession, endSessionsOf, listSessions } from '~/sign-in/sessions.server'
import { themeOf } from '~/theme.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/account'

export async function loader({ context, request }: Route.LoaderArgs) {
  const user = context.get(signedInContext)
  const sessions = await listSessions(database(), user.userId, context.get(sessionContext))
  return {
    name: user.name,
    email: user.email,
    theme: await themeOf(request),
    sessions: sessions.map((session) => ({
      startedAt: session.startedAt.toISOString(),
      lastSeenAt: session.lastSeenAt.toISOString(),
      isThisOne: session.isThisOne,
    })),
  }
}

/** Signs out everywhere: the only form of this page. */
export async function action({ context, request }: Route.ActionArgs) {
  const intent = (await request.formData()).get('intent')
  if (intent !== 'sign out everywhere') {
    return data({ error: { '': ['This page can sign you out everywhere, and nothing else.'] } }, 400)
  }
  await endSessionsOf(database(), context.get(signedInContext).userId)
  return redirect(href('/sign-in'), { headers: { 'Set-Cookie': await endSession(database(), request) } })
}

export default function Account({ loaderData, actionData }: Route.ComponentProps) {
  const isBusy = useNavigation().state !== 'idle'
  const { minute } = localTime('UTC')
  return (
    <>
      <PageTitle title="Account" />
      <FormMessage result={actionData} />
      <dl className="mb-8 grid max-w-xl grid-cols-[auto_1fr] gap-x-6 gap-y-1">
        <dt className="text-flint-2">Name</dt>
        <dd className="font-semibold">{loaderData.name}</dd>
        <dt className="text-flint-2">E-mail address</dt>
        <dd className="break-words">{loaderData.email}</dd>
      </dl>
      <h2 className="mb-2 text-[1.15rem] font-semibold">Colours</h2>
      <ThemeChoice action={href('/theme')} chosen={loaderData.theme} />
      <h2 className="mt-8 mb-2 text-[1.15rem] font-semibold">Where you are signed in</h2>
      <div className="max-w-2xl">
        <DataTable
          caption="Where you are signed in"
          rows={loaderData.sessions}
          rowKey={(session) => session.startedAt}
          columns={[
            {
              head: 'Browser',
              words: true,
              cell: (session) => (session.isThisOne ? 'this one' : 'another one'),
            },
            { head: 'Signed in', unit: 'UTC', cell: (session) => minute(session.startedAt) },
            { head: 'Last used', unit: 'UTC', cell: (session) => minute(session.lastSeenAt) },
          ]}
        />
        <p className="mt-2 mb-4 text-[0.9rem] text-flint-2">
          A browser that is not used for 12 hours is signed out, and each one after 14 days.
        </p>
        <Form method="post">
          <Button type="submit" name="intent" value="sign out everywhere" disabled={isBusy}>
            Sign out everywhere
          </Button>
        </Form>
      </div>
    </>
  )
}
