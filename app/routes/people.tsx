import { useForm } from '@conform-to/react'
import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, useNavigation } from 'react-router'
import { z } from 'zod'
import { Button } from '~/components/button'
import { Confirm } from '~/components/confirm'
import { Field } from '~/components/field'
import { fieldProps } from '~/components/form-field'
import { FormMessage } from '~/components/form-message'
import { localTime } from '~/components/local-time'
import { PageTitle } from '~/components/page-title'
import {
  addPerson,
  bringBack,
  listPeople,
  markAsLeft,
  type PersonRefusal,
  setAdministrator,
} from '~/projects/people.server'
import { personSchema } from '~/projects/person'
import { requireAdministrator } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/people'

export async function loader({ context }: Route.LoaderArgs) {
  const { userId } = requireAdministrator(context)
  const people = await listPeople(database())
  return {
    me: userId,
    people: people.map((person) => ({
      id: person.id,
      name: person.name,
      email: person.email,
      isAdministrator: person.isAdministrator,
      hasSignedIn: person.firstSignedInAt !== null,
      leftOn: person.leftAt && localTime('UTC').day(person.leftAt.toISOString()),
    })),
  }
}

const id = z.coerce.number().int().positive()
const formSchema = z.discriminatedUnion('intent', [
  personSchema.extend({ intent: z.literal('add') }),
  z.object({ intent: z.literal('make administrator'), userId: id }),
  z.object({ intent: z.literal('end administrator'), userId: id }),
  z.object({ intent: z.literal('mark as left'), userId: id }),
  z.object({ intent: z.literal('bring back'), userId: id }),
])

const refusals: Record<PersonRefusal, string> = {
  'unknown person': 'There is no such person.',
  'last administrator': 'This is the last administrator: make somebody else one first.',
  'has left': 'This person has left: bring them back first.',
}

export async function action({ context, request }: Route.ActionArgs) {
  const user = requireAdministrator(context)
  const submission = parseWithZod(await request.formData(), { schema: formSchema })
  if (submission.status !== 'success') return data(submission.reply(), 400)
  const db = database()
  const form = submission.value
  if (form.intent === 'add') {
    const added = await addPerson(db, { name: form.name, email: form.email }, user.userId)
    if (added === 'taken') {
      return data(
        submission.reply({ fieldErrors: { email: ['Somebody with this address is here already.'] } }),
        400,
      )
    }
    return { ...submission.reply(), done: `${form.name} can sign in now.` }
  }
  const [refusal, done] = await change(form, user.userId)
  if (refusal) return data(submission.reply({ formErrors: [refusals[refusal]] }), 400)
  return { ...submission.reply(), done }
}

async function change(
  form: {
    intent: 'make administrator' | 'end administrator' | 'mark as left' | 'bring back'
    userId: number
  },
  byUserId: number,
): Promise<[PersonRefusal | undefined, string]> {
  const db = database()
  switch (form.intent) {
    case 'make administrator':
      return [await setAdministrator(db, form.userId, true, byUserId), 'An administrator more.']
    case 'end administrator':
      return [await setAdministrator(db, form.userId, false, byUserId), 'No longer an administrator.']
    case 'mark as left':
      return [
        await markAsLeft(db, form.userId, byUserId),
        'Marked as left; every session and membership ended.',
      ]
    case 'bring back':
      return [await bringBack(db, form.userId, byUserId), 'Can sign in again.']
  }
}

type PersonLine = Route.ComponentProps['loaderData']['people'][number]

export default function People({ loaderData, actionData }: Route.ComponentProps) {
  return (
    <>
      <PageTitle title="People" />
      <FormMessage result={actionData} />
      <ul className="border-t border-rule">
        {loaderData.people.map((person) => (
          <li
            key={person.id}
            className="grid gap-x-6 gap-y-1 border-b border-rule py-2.5 sm:grid-cols-[1fr_11rem_19rem]"
          >
            <div className="min-w-0">
              <p className={`font-semibold ${person.leftOn ? 'text-flint-2' : ''}`}>
                {person.name}
                {person.isAdministrator && <span className="font-normal text-flint-2">, administrator</span>}
              </p>
              <p className="break-words text-flint-2">{person.email}</p>
            </div>
            <p className="text-flint-2">
              {person.leftOn ? `left ${person.leftOn}` : person.hasSignedIn ? 'active' : 'not signed in yet'}
            </p>
            <Change person={person} isMe={person.id === loaderData.me} />
          </li>
        ))}
      </ul>
      <AddPerson key={loaderData.people.length} result={actionData} />
    </>
  )
}

function Change({ person, isMe }: { person: PersonLine; isMe: boolean }) {
  const isBusy = useNavigation().state !== 'idle'
  if (person.leftOn) {
    return (
      <Form method="post">
        <input type="hidden" name="userId" value={person.id} />
        <Button type="submit" look="quiet" name="intent" value="bring back" disabled={isBusy}>
          Bring back
        </Button>
      </Form>
    )
  }
  return (
    <div className="flex flex-wrap items-start gap-x-2">
      <Form method="post">
        <input type="hidden" name="userId" value={person.id} />
        {person.isAdministrator ? (
          <Confirm
            label="End administrator"
            question={`${isMe ? 'You' : person.name} will be signed out and look after people and projects no longer.`}
            yes="End administrator"
            name="intent"
            value="end administrator"
            disabled={isBusy}
          />
        ) : (
          <Confirm
            label="Make administrator"
            question={`${person.name} will look after people and projects, and has to sign in anew.`}
            yes="Make administrator"
            name="intent"
            value="make administrator"
            disabled={isBusy}
          />
        )}
      </Form>
      <Form method="post">
        <input type="hidden" name="userId" value={person.id} />
        <Confirm
          label="Mark as left"
          question={`${isMe ? 'You' : person.name} will be signed out everywhere, and every membership ends. What was signed and recorded stays.`}
          yes="Mark as left"
          name="intent"
          value="mark as left"
          disabled={isBusy}
        />
      </Form>
    </div>
  )
}

function AddPerson({ result }: { result: Route.ComponentProps['actionData'] }) {
  const [form, fields] = useForm({
    lastResult: result?.status === 'error' && result.initialValue?.intent === 'add' ? result : undefined,
    onValidate: ({ formData }) => parseWithZod(formData, { schema: personSchema }),
    shouldRevalidate: 'onInput',
  })
  const isBusy = useNavigation().state !== 'idle'
  return (
    <section className="mt-10 max-w-2xl">
      <h2 className="mb-3 text-[1.15rem] font-semibold">Add a person</h2>
      <Form method="post" id={form.id} onSubmit={form.onSubmit} noValidate>
        <div className="grid gap-4 sm:grid-cols-2">
          <Field
            {...fieldProps(fields.name)}
            key={fields.name.key}
            label="Name"
            maxLength={120}
            autoComplete="off"
          />
          <Field
            {...fieldProps(fields.email)}
            key={fields.email.key}
            label="E-mail address"
            type="email"
            autoComplete="off"
          />
        </div>
        <Button type="submit" look="primary" name="intent" value="add" disabled={isBusy} className="mt-4">
          Add the person
        </Button>
      </Form>
    </section>
  )
}
