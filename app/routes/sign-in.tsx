import { useForm } from '@conform-to/react'
import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, href, Link, redirect, useNavigation } from 'react-router'
import { clientAddress } from '~/client-address'
import { Button } from '~/components/button'
import { Field } from '~/components/field'
import { fieldProps } from '~/components/form-field'
import { FormMessage } from '~/components/form-message'
import { Letterhead } from '~/components/letterhead'
import { environment } from '~/environment.server'
import { peopleWithRoles } from '~/projects/people.server'
import { roleNames } from '~/projects/permissions'
import { findSignedIn } from '~/sign-in/guard.server'
import { nextPage } from '~/sign-in/next-page'
import { signInSchema, waitInWords } from '~/sign-in/sign-in'
import { askForSignIn } from '~/sign-in/sign-in.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/sign-in'

export async function loader({ request, url }: Route.LoaderArgs) {
  const next = nextPage(url.searchParams.get('next'))
  if (await findSignedIn(request)) throw redirect(next)
  const isDemo = environment().mode === 'demo'
  return { next, isDemo, demoPeople: isDemo ? await peopleWithRoles(database()) : [] }
}

export async function action({ request, url, context }: Route.ActionArgs) {
  const submission = parseWithZod(await request.formData(), { schema: signInSchema })
  if (submission.status !== 'success') return data(submission.reply(), 400)
  const sent = await askForSignIn(database(), submission.value.email, context.get(clientAddress))
  if ('waitSeconds' in sent) {
    const wait = `Too many codes were asked for. Wait ${waitInWords(sent.waitSeconds)}, then try again.`
    return data(submission.reply({ formErrors: [wait] }), 429)
  }
  const next = nextPage(url.searchParams.get('next'))
  const search = next === '/' ? '' : `?next=${encodeURIComponent(next)}`
  return redirect(href('/sign-in/code') + search, { headers: { 'Set-Cookie': sent.cookie } })
}

export default function SignIn({ loaderData, actionData }: Route.ComponentProps) {
  const [form, fields] = useForm({
    lastResult: actionData,
    onValidate: ({ formData }) => parseWithZod(formData, { schema: signInSchema }),
    shouldRevalidate: 'onInput',
  })
  const isBusy = useNavigation().state !== 'idle'
  return (
    <Letterhead title="Sign in">
      <FormMessage result={actionData} />
      <Form method="post" id={form.id} onSubmit={form.onSubmit} noValidate className="max-w-sm">
        <Field
          {...fieldProps(fields.email)}
          key={fields.email.key}
          label="E-mail address"
          type="email"
          autoComplete="email"
          hint="A code of six figures is sent there. There is no password."
        />
        <Button type="submit" look="primary" disabled={isBusy} className="mt-4">
          Send me a code
        </Button>
      </Form>
      {loaderData.isDemo && (
        <section className="mt-10 border-t border-rule pt-5">
          <h2 className="text-[1.15rem] font-semibold">Demo</h2>
          <p className="mb-3 text-flint-2">
            The demo's mail arrives{' '}
            <Link to={href('/mail')} className="underline">
              here
            </Link>
            . Choose whom to be, then read the code there.
          </p>
          <Form method="post">
            <ul>
              {loaderData.demoPeople.map((person) => (
                <li key={person.email} className="border-b border-rule first:border-t">
                  <button
                    type="submit"
                    name="email"
                    value={person.email}
                    disabled={isBusy}
                    className="flex w-full flex-wrap items-baseline justify-between gap-x-4 px-1 py-2 text-left hover:bg-chalk-2"
                  >
                    <span className="font-semibold text-bourne">{person.name}</span>
                    <span className="text-flint-2">
                      {[
                        ...person.roles.map((role) => roleNames[role]),
                        ...(person.isAdministrator ? ['administrator'] : []),
                      ].join(', ') || 'no project'}
                    </span>
                  </button>
                </li>
              ))}
            </ul>
          </Form>
        </section>
      )}
    </Letterhead>
  )
}
