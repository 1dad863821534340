import { useForm } from '@conform-to/react'
import { parseWithZod } from '@conform-to/zod/v4'
import { data, Form, useNavigation } from 'react-router'
import { z } from 'zod'
import { Button } from '~/components/button'
import { Confirm } from '~/components/confirm'
import { DataTable } from '~/components/data-table'
import { Field, SelectField } from '~/components/field'
import { fieldProps } from '~/components/form-field'
import { FormMessage } from '~/components/form-message'
import { localTime } from '~/components/local-time'
import { PageTitle } from '~/components/page-title'
import { membershipContext, permit } from '~/projects/guard.server'
import {
  changeRole,
  endMembership,
  inviteMember,
  listMembers,
  type MemberRefusal,
  mailInvitation,
} from '~/projects/members.server'
import { can, permissionTable, type Role, roleNames, roles } from '~/projects/permissions'
import { invitationSchema, roleSchema } from '~/projects/person'
import { type ProjectInput, projectSchema } from '~/projects/project'
import { ProjectFieldset } from '~/projects/project-form'
import { isNumberTaken, settingsOf, settingsVersion, updateProject } from '~/projects/projects.server'
import { waitInWords } from '~/sign-in/sign-in'
import { database } from '~database/connection.server'
import type { Route } from './+types/settings'

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'settings')
  const members = await listMembers(database(), project.id)
  return {
    settings: settingsOf(project),
    seen: settingsVersion(project),
    timeZones: can(member, 'edit', 'settings') ? Intl.supportedValuesOf('timeZone') : [],
    members: members.map((line) => ({
      ...line,
      since: localTime(project.timeZone).day(line.since.toISOString()),
    })),
    me: member.userId,
    mayEdit: can(member, 'edit', 'settings'),
    mayManage: can(member, 'manage', 'members'),
    permissions: permissionTable(),
  }
}

const userId = z.coerce.number().int().positive()
const formSchema = z.discriminatedUnion('intent', [
  projectSchema.extend({ intent: z.literal('settings'), seen: z.string() }),
  invitationSchema.extend({ intent: z.literal('invite') }),
  z.object({ intent: z.literal('send again'), userId }),
  z.object({ intent: z.literal('change role'), userId, seen: roleSchema, role: roleSchema }),
  z.object({ intent: z.literal('end membership'), userId }),
])

const refusals: Record<MemberRefusal, [status: number, text: string]> = {
  'not a member': [404, 'This person is not a member of the project.'],
  'last project manager': [400, 'This is the last project manager: give somebody else that role first.'],
  'changed meanwhile': [409, 'Somebody else changed this role meanwhile. Look again before you change it.'],
  'has left': [400, 'This person has left the firm.'],
}

const inviteRefusals = {
  'name needed': { name: ['This address is new here: give the name as well.'] },
  'has left': { email: ['This person has left the firm; an administrator can bring them back.'] },
  'has another role': {
    role: ['This person is a member in another role: change it in the list of members.'],
  },
}

export async function action({ context, request }: Route.ActionArgs) {
  // Whoever may do neither of the two learns nothing about the form either.
  const { member } = context.get(membershipContext)
  if (!can(member, 'edit', 'settings')) permit(context, 'manage', 'members')
  const submission = parseWithZod(await request.formData(), { schema: formSchema })
  if (submission.status !== 'success') return data(submission.reply(), 400)
  const form = submission.value
  const db = database()

  if (form.intent === 'settings') {
    const { project, user } = permit(context, 'edit', 'settings')
    const { intent: _, seen, ...input } = form
    try {
      const refusal = await updateProject(db, project.id, input, user.userId, seen)
      if (!refusal) return { ...submission.reply(), done: 'The settings are saved.' }
      const text =
        'Somebody else saved these settings meanwhile. Load the page again to see them; yours are still here.'
      return data(submission.reply({ formErrors: [text] }), 409)
    } catch (error) {
      if (!isNumberTaken(error)) throw error
      return data(submission.reply({ fieldErrors: { number: ['Another project has this number.'] } }), 400)
    }
  }

  const { project, user } = permit(context, 'manage', 'members')
  if (form.intent === 'invite') {
    const answer = await inviteMember(db, project.id, form, user.userId)
    if (!answer.ok) return data(submission.reply({ fieldErrors: inviteRefusals[answer.refusal] }), 400)
    if (!answer.isNew) return { ...submission.reply(), done: `${form.email} is a member already.` }
    return {
      ...submission.reply(),
      done: await mailed(project.id, answer.userId, user.name),
    }
  }
  if (form.intent === 'send again') {
    const isMember = (await listMembers(db, project.id)).some((line) => line.userId === form.userId)
    if (!isMember) return refused('not a member')
    return { ...submission.reply(), done: await mailed(project.id, form.userId, user.name) }
  }
  if (form.intent === 'change role') {
    const refusal = await changeRole(db, project.id, form, user.userId)
    if (refusal) return refused(refusal)
    return { ...submission.reply(), done: 'The role is changed; the person has to sign in anew.' }
  }
  const refusal = await endMembership(db, project.id, form.userId, user.userId)
  if (refusal) return refused(refusal)
  return {
    ...submission.reply(),
    done: 'The membership has ended, and with it every session of that person.',
  }

  function refused(reason: MemberRefusal) {
    const [status, text] = refusals[reason]
    return data(submission.reply({ formErrors: [text] }), status)
  }
}

/** What became of the mail; the membership stands either way. */
async function mailed(projectId: number, invitedId: number, invitedBy: string): Promise<string> {
  try {
    const sent = await mailInvitation(database(), projectId, invitedId, invitedBy)
    if (sent === 'not a member') return 'This person is not a member any more.'
    if (sent.waitSeconds)
      return `Enough mails went there for now; wait ${waitInWords(sent.waitSeconds)} before the next.`
    return 'The invitation is on its way.'
  } catch (error) {
    console.error('An invitation could not be mailed:', error)
    return 'The person is a member, but the mail server did not take the invitation. Send it again later.'
  }
}

type Loaded = Route.ComponentProps['loaderData']
type Result = Route.ComponentProps['actionData']
type MemberLine = Loaded['members'][number]

export default function Settings({ loaderData, actionData }: Route.ComponentProps) {
  return (
    <main id="work" className="max-w-5xl min-w-0 flex-1 px-4 pt-5 pb-12 wide:px-6">
      <PageTitle title="Project settings" />
      <FormMessage result={actionData} />
      {loaderData.mayEdit ? (
        <SettingsForm key={loaderData.seen} loaded={loaderData} result={actionData} />
      ) : (
        <SettingsList settings={loaderData.settings} />
      )}
      <h2 className="mt-10 mb-3 text-[1.15rem] font-semibold" id="members">
        Members
      </h2>
      <Members loaded={loaderData} />
      {loaderData.mayManage && <Invite key={loaderData.members.length} result={actionData} />}
      <h2 className="mt-10 mb-1 text-[1.15rem] font-semibold">Who may do what</h2>
      <p className="mb-3 max-w-prose text-flint-2">
        Checker and approver of a package are never its originator. Administrators of the firm look after
        people and projects; that alone opens no calc book.
      </p>
      <Permissions permissions={loaderData.permissions} />
    </main>
  )
}

function SettingsForm({ loaded, result }: { loaded: Loaded; result: Result }) {
  const [form, fields] = useForm<ProjectInput>({
    lastResult: result?.status === 'error' && result.initialValue?.intent === 'settings' ? result : undefined,
    defaultValue: { ...loaded.settings, crsEpsg: String(loaded.settings.crsEpsg) },
    onValidate: ({ formData }) => parseWithZod(formData, { schema: projectSchema }),
    shouldRevalidate: 'onInput',
  })
  const isBusy = useNavigation().state !== 'idle'
  return (
    <Form method="post" id={form.id} onSubmit={form.onSubmit} noValidate className="max-w-3xl">
      <input type="hidden" name="seen" value={loaded.seen} />
      <ProjectFieldset fields={fields} timeZones={loaded.timeZones} />
      <Button type="submit" look="primary" name="intent" value="settings" disabled={isBusy} className="mt-5">
        Save the settings
      </Button>
    </Form>
  )
}

function SettingsList({ settings }: { settings: ProjectInput }) {
  const lines: [string, string][] = [
    ['Project number', settings.number],
    ['Title', settings.title],
    ['Client', settings.client],
    ['Calculation reference', settings.calcReference],
    ['Grid reference system', `EPSG:${settings.crsEpsg}`],
    ['Vertical datum', settings.verticalDatum],
    ['Time zone of the site', settings.timeZone],
    ['Units shown', `${settings.lengthUnit}, ${settings.timeUnit}`],
  ]
  return (
    <dl className="grid max-w-3xl grid-cols-[auto_1fr] gap-x-6 gap-y-1">
      {lines.map(([label, value]) => (
        <div key={label} className="contents">
          <dt className="text-flint-2">{label}</dt>
          <dd className="break-words">{value}</dd>
        </div>
      ))}
    </dl>
  )
}

function Members({ loaded }: { loaded: Loaded }) {
  return (
    <ul className="max-w-4xl border-t border-rule">
      {loaded.members.map((line) => (
        <li
          key={line.userId}
          className="grid items-start gap-x-6 gap-y-1.5 border-b border-rule py-2.5 md:grid-cols-[1fr_20rem_9rem]"
        >
          <div className="min-w-0">
            <p className="font-semibold">{line.name}</p>
            <p className="break-words text-flint-2">{line.email}</p>
            {line.hasSignedIn ? (
              <p className="text-[0.9rem] text-flint-2">member since {line.since}</p>
            ) : (
              <InvitedLine line={line} mayManage={loaded.mayManage} />
            )}
          </div>
          {loaded.mayManage ? <RoleForm line={line} /> : <p>{roleNames[line.role]}</p>}
          {loaded.mayManage && <EndMembership line={line} isMe={line.userId === loaded.me} />}
        </li>
      ))}
    </ul>
  )
}

function RoleForm({ line }: { line: MemberLine }) {
  const isBusy = useNavigation().state !== 'idle'
  return (
    <Form method="post" className="flex gap-2" key={line.role}>
      <input type="hidden" name="userId" value={line.userId} />
      <input type="hidden" name="seen" value={line.role} />
      <select
        name="role"
        defaultValue={line.role}
        aria-label={`Role of ${line.name}`}
        className="rounded border border-rule bg-chalk px-2 py-1"
      >
        <RoleOptions />
      </select>
      <Button type="submit" look="quiet" name="intent" value="change role" disabled={isBusy}>
        Change
      </Button>
    </Form>
  )
}

function RoleOptions() {
  return roles.map((role) => (
    <option key={role} value={role}>
      {roleNames[role]}
    </option>
  ))
}

function InvitedLine({ line, mayManage }: { line: MemberLine; mayManage: boolean }) {
  const isBusy = useNavigation().state !== 'idle'
  return (
    <div className="flex flex-wrap gap-x-3 text-[0.9rem]">
      <p className="text-ochre">invited {line.since}, not signed in yet</p>
      {mayManage && (
        <Form method="post">
          <input type="hidden" name="userId" value={line.userId} />
          <button
            type="submit"
            name="intent"
            value="send again"
            disabled={isBusy}
            className="text-bourne hover:underline"
          >
            Send the invitation again
          </button>
        </Form>
      )}
    </div>
  )
}

function EndMembership({ line, isMe }: { line: MemberLine; isMe: boolean }) {
  const isBusy = useNavigation().state !== 'idle'
  return (
    <Form method="post">
      <input type="hidden" name="userId" value={line.userId} />
      <Confirm
        label="End membership"
        question={`${isMe ? 'You' : line.name} will be signed out and not see this project any more. What was signed and recorded stays.`}
        yes="End the membership"
        name="intent"
        value="end membership"
        disabled={isBusy}
      />
    </Form>
  )
}

function Invite({ result }: { result: Result }) {
  const [form, fields] = useForm({
    lastResult:
      result?.initialValue?.intent === 'invite' || result?.initialValue === null ? result : undefined,
    onValidate: ({ formData }) => parseWithZod(formData, { schema: invitationSchema }),
    shouldRevalidate: 'onInput',
  })
  const isBusy = useNavigation().state !== 'idle'
  return (
    <Form method="post" id={form.id} onSubmit={form.onSubmit} noValidate className="mt-5 max-w-3xl">
      <h3 className="mb-2 font-semibold">Invite by e-mail</h3>
      <div className="grid gap-4 sm:grid-cols-3">
        <Field
          {...fieldProps(fields.email)}
          key={fields.email.key}
          label="E-mail address"
          type="email"
          autoComplete="off"
        />
        <Field
          {...fieldProps(fields.name)}
          key={fields.name.key}
          label="Name"
          maxLength={120}
          autoComplete="off"
          hint="For somebody who is new here."
        />
        <SelectField {...fieldProps(fields.role)} key={fields.role.key} label="Role">
          <option value="">choose</option>
          <RoleOptions />
        </SelectField>
      </div>
      <Button type="submit" look="primary" name="intent" value="invite" disabled={isBusy} className="mt-4">
        Invite
      </Button>
    </Form>
  )
}

function Permissions({ permissions }: { permissions: Loaded['permissions'] }) {
  const shortNames: Record<Role, string> = {
    'project manager': 'project manager',
    originator: 'originator',
    checker: 'checker',
    approver: 'approver',
    data: 'data',
    client: 'client',
  }
  return (
    <DataTable
      caption="Who may do what"
      rows={permissions}
      rowKey={(line) => `${line.verb} ${line.subject}`}
      columns={[
        {
          head: 'Deed',
          cell: (line) => <span className="font-normal">{`${line.verb} ${line.subject}`}</span>,
        },
        ...roles.map((role) => ({
          head: shortNames[role],
          words: true,
          cell: (line: Loaded['permissions'][number]) =>
            line.roles.includes(role) ? (
              <span className="whitespace-nowrap text-moss">
                <span aria-hidden>● </span>yes
              </span>
            ) : (
              <span className="text-flint-2">no</span>
            ),
        })),
      ]}
    />
  )
}
