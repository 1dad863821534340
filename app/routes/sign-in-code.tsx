import { useForm } from '@conform-to/react'
import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, href, Link, redirect, useNavigation } from 'react-router'
import { clientAddress } from '~/client-address'
import { Button } from '~/components/button'
import { Field } from '~/components/field'
import { fieldProps } from '~/components/form-field'
import { FormMessage } from '~/components/form-message'
import { Letterhead } from '~/components/letterhead'
import { Notice } from '~/components/notice'
import { environment } from '~/environment.server'
import { emailUnderWay, hasAskedForCode } from '~/sign-in/codes.server'
import { nextPage } from '~/sign-in/next-page'
import { codeSchema, waitInWords } from '~/sign-in/sign-in'
import { signInPurpose, signInWithCode } from '~/sign-in/sign-in.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/sign-in-code'

export async function loader({ request, url }: Route.LoaderArgs) {
  const email = await emailUnderWay(database(), request, signInPurpose)
  if (!email) throw redirect(href('/sign-in') + url.search)
  return { email, search: url.search, isDemo: environment().mode === 'demo' }
}

export async function action({ request, url, context }: Route.ActionArgs) {
  if (!(await hasAskedForCode(request))) return redirect(href('/sign-in') + url.search)
  const submission = parseWithZod(await request.formData(), { schema: codeSchema })
  if (submission.status !== 'success') return data(submission.reply(), 400)
  const answer = await signInWithCode(database(), {
    request,
    code: submission.value.code,
    clientAddress: context.get(clientAddress),
  })
  if ('cookies' in answer) {
    const headers = new Headers(answer.cookies.map((cookie) => ['Set-Cookie', cookie]))
    return redirect(nextPage(url.searchParams.get('next')), { headers })
  }
  if (answer.reason === 'too many') {
    const wait = `Too many codes were tried. Wait ${waitInWords(answer.waitSeconds ?? 60)}, then try again.`
    return data(submission.reply({ formErrors: [wait] }), 429)
  }
  if (answer.reason === 'wrong') {
    return data(submission.reply({ fieldErrors: { code: ['This is not the code that was sent.'] } }), 400)
  }
  const ended =
    'This code has ended: it was used, is older than ten minutes, or was tried too often. Ask for a new one.'
  return data(submission.reply({ formErrors: [ended] }), 400)
}

export default function SignInCode({ loaderData, actionData }: Route.ComponentProps) {
  const [form, fields] = useForm({
    lastResult: actionData,
    onValidate: ({ formData }) => parseWithZod(formData, { schema: codeSchema }),
  })
  const isBusy = useNavigation().state !== 'idle'
  return (
    <Letterhead title="Enter the code">
      <p className="mb-4">
        If <b className="font-semibold break-words">{loaderData.email}</b> is known here, a code of six
        figures is on its way there.
      </p>
      {loaderData.isDemo && (
        <Notice>
          The demo's mail arrives{' '}
          <Link to={href('/mail')} target="_blank" className="underline">
            here (in a new tab)
          </Link>
          .
        </Notice>
      )}
      <FormMessage result={actionData} />
      <Form method="post" id={form.id} onSubmit={form.onSubmit} noValidate className="max-w-48">
        <Field
          {...fieldProps(fields.code)}
          key={fields.code.key}
          label="Code"
          inputMode="numeric"
          autoComplete="one-time-code"
          maxLength={12}
        />
        <Button type="submit" look="primary" disabled={isBusy} className="mt-4">
          Sign in
        </Button>
      </Form>
      <p className="mt-8 text-flint-2">
        Nothing came, or it ended?{' '}
        <Link to={href('/sign-in') + loaderData.search} className="underline">
          Ask for a new code
        </Link>
        .
      </p>
    </Letterhead>
  )
}
