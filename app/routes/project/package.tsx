import { type SubmissionResult, useForm } from '@conform-to/react'
import { parseWithZod } from '@conform-to/zod/v4'
import { useEffect, useState } from 'react'
import { data, Form, href, Link, useNavigation, useRevalidator } from 'react-router'
import { sectionStates } from '~/book/sections.server'
import { Button, DownloadButton } from '~/components/button'
import { Confirm } from '~/components/confirm'
import { DataTable } from '~/components/data-table'
import { Field, SelectField } from '~/components/field'
import { fieldProps } from '~/components/form-field'
import { FormMessage } from '~/components/form-message'
import { localTime } from '~/components/local-time'
import { Caution, Notice } from '~/components/notice'
import { Heading, SectionPage } from '~/components/section-page'
import { listRuns } from '~/heads/runs.server'
import { newPackageSchema, type PackageLine, statusMeaning } from '~/packages/package'
import {
  bookHasMoved,
  findPackage,
  gatherAgain,
  issuePackage,
  listPackages,
  makePackage,
  signPackage,
  warningsToAccept,
  withdrawPackage,
} from '~/packages/packages.server'
import { idFrom, membershipContext, permit } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { database } from '~database/connection.server'
import type { Route } from './+types/package'

export async function loader({ context }: Route.LoaderArgs) {
  const { project, member } = permit(context, 'view', 'draft package')
  const db = database()
  const [packages, runs, states] = await Promise.all([
    listPackages(db, project.id),
    listRuns(db, project),
    sectionStates(db, project.id),
  ])
  const open = packages.find((p) => isOpen(p))
  const openRow = open && (await findPackage(db, project.id, open.id))
  return {
    packages,
    open: open ?? null,
    moved: open ? await bookHasMoved(db, project.id, open.id) : false,
    toAccept: openRow ? await warningsToAccept(db, project.id, openRow) : [],
    runs: runs
      .filter((run) => run.state === 'done' && run.converged)
      .map((run) => ({ id: run.id, number: run.number, caseName: run.caseName, stale: run.stale })),
    states: states.map((s) => ({ key: s.key, state: s.state })),
    timeZone: project.timeZone,
    may: {
      make: can(member, 'make', 'package'),
      sign: {
        originator: can(member, 'sign', 'as originator'),
        checker: can(member, 'sign', 'as checker'),
        approver: can(member, 'sign', 'as approver'),
      },
      issue: can(member, 'issue', 'package'),
    },
  }
}

function isOpen(p: Pick<PackageLine, 'status'>): boolean {
  return (
    p.status === 'draft' ||
    p.status === 'shared for check' ||
    p.status === 'checked' ||
    p.status === 'approved'
  )
}

export async function action({ context, request }: Route.ActionArgs) {
  const { project, member } = context.get(membershipContext)
  const db = database()
  const form = await request.formData()
  const intent = String(form.get('intent'))
  const packageId = () => idFrom(String(form.get('packageId') ?? ''))
  const seen = String(form.get('inputSha256') ?? '')
  const answer = (outcome: { ok: true } | { ok: false; message: string }, done: string) =>
    outcome.ok
      ? data({ done }, { status: 200 })
      : data({ error: { '': [outcome.message] } as Record<string, string[] | null> }, { status: 400 })

  switch (intent) {
    case 'make': {
      permit(context, 'make', 'package')
      const submission = parseWithZod(form, { schema: newPackageSchema })
      if (submission.status !== 'success') return data({ submission: submission.reply() }, { status: 400 })
      const made = await makePackage(db, project, submission.value, member.userId)
      return made.ok
        ? answer(made, 'The revision is made and is being drawn.')
        : data({ submission: submission.reply({ formErrors: [made.message] }) }, { status: 400 })
    }
    case 'gather':
      permit(context, 'make', 'package')
      return answer(
        await gatherAgain(db, project, packageId(), member.userId),
        'The book was gathered again.',
      )
    case 'withdraw':
      permit(context, 'make', 'package')
      return answer(
        await withdrawPackage(db, project, packageId(), member.userId),
        'The revision is withdrawn.',
      )
    case 'sign originator':
      permit(context, 'sign', 'as originator')
      return answer(
        await signPackage(db, project, packageId(), 'originator', member.userId, seen),
        'Signed, and shared for check.',
      )
    case 'sign checker':
      permit(context, 'sign', 'as checker')
      return answer(
        await signPackage(db, project, packageId(), 'checker', member.userId, seen),
        'Signed as checker.',
      )
    case 'sign approver':
      permit(context, 'sign', 'as approver')
      return answer(
        await signPackage(db, project, packageId(), 'approver', member.userId, seen),
        'Signed as approver.',
      )
    case 'issue':
      permit(context, 'issue', 'package')
      return answer(
        await issuePackage(db, project, packageId(), member.userId),
        'The package is being drawn with its signatures; it is issued when that is done.',
      )
    default:
      permit(context, 'view', 'draft package')
      return answer({ ok: false, message: 'The page asked for something unknown: reload it.' }, '')
  }
}

export default function PackagePage({ loaderData, actionData, params }: Route.ComponentProps) {
  const { packages, open, moved, toAccept, runs, states, may } = loaderData
  const time = localTime(loaderData.timeZone)
  const issued = packages.find((p) => p.status === 'issued')
  const reopened = states.filter((s) => s.state === 'changed since check')
  const unchecked = states.filter((s) => s.key !== 'package' && s.state === 'drafted')
  const pdf = (p: PackageLine) =>
    href('/projects/:projectId/packages/:packageId/pdf', {
      projectId: params.projectId,
      packageId: String(p.id),
    })
  return (
    <SectionPage
      number={9}
      title="Package"
      references={packages
        .filter((p) => p.inputSha256)
        .map((p) => ({
          no: p.revision,
          text: (
            <>
              input {p.inputSha256?.slice(0, 12)}…, run {p.runNumber}
            </>
          ),
        }))}
      carried={[
        {
          label: 'Latest issued',
          value: issued?.revision ?? 'none',
          note: issued?.issuedAt ? `issued ${time.day(issued.issuedAt)}` : 'nothing has been issued yet',
          state: issued ? 'good' : undefined,
        },
        ...(open ? [{ label: 'Open revision', value: open.revision, note: statusMeaning[open.status] }] : []),
        {
          label: 'Sections to check',
          value: String(reopened.length + unchecked.length),
          note:
            reopened.length > 0
              ? `${reopened.length} changed since check`
              : unchecked.length > 0
                ? 'not checked yet'
                : 'all checked',
          state: reopened.length > 0 ? 'alarm' : unchecked.length > 0 ? 'warn' : 'good',
        },
      ]}
      carryFoot={<Caution />}
    >
      {actionData && 'done' in actionData && <FormMessage result={actionData} />}
      {actionData && 'error' in actionData && <FormMessage result={actionData} />}

      <Heading no="9.1">Revision in hand</Heading>
      {open ? (
        <OpenRevision
          key={open.id}
          line={open}
          moved={moved}
          toAccept={toAccept}
          may={may}
          pdf={pdf(open)}
          params={params}
          time={time}
        />
      ) : (
        <p className="text-flint-2">No revision is open.{may.make ? ' Make the next one below.' : ''}</p>
      )}

      {may.make && !open && (
        <NewRevision
          runs={runs}
          result={actionData && 'submission' in actionData ? actionData.submission : undefined}
        />
      )}

      <Heading no="9.2">Revisions</Heading>
      <DataTable
        caption="Revisions of the package"
        rows={packages}
        rowKey={(p) => p.id}
        empty="No revision has been made yet."
        columns={[
          { head: 'Revision', cell: (p) => p.revision },
          { head: 'Status', words: true, cell: (p) => <span className="whitespace-nowrap">{p.status}</span> },
          { head: 'Reason', words: true, cell: (p) => <span className="block min-w-40">{p.reason}</span> },
          { head: 'Run', cell: (p) => p.runNumber ?? '–' },
          {
            head: 'Made',
            words: true,
            cell: (p) => (
              <>
                <span className="whitespace-nowrap">{time.day(p.createdAt)}</span>, {p.createdBy}
              </>
            ),
          },
          {
            head: 'Issued',
            words: true,
            cell: (p) => <span className="whitespace-nowrap">{p.issuedAt ? time.day(p.issuedAt) : '–'}</span>,
          },
          {
            head: 'PDF',
            words: true,
            cell: (p) =>
              p.hasPdf ? (
                <span className="whitespace-nowrap">
                  <a href={pdf(p)} download>
                    PDF
                  </a>
                  {p.pdfSha256 && (
                    <code className="ml-2 text-[0.8rem] text-flint-2" title={`SHA-256 ${p.pdfSha256}`}>
                      {p.pdfSha256.slice(0, 12)}…
                    </code>
                  )}
                </span>
              ) : (
                '–'
              ),
          },
        ]}
      />
    </SectionPage>
  )
}

interface May {
  make: boolean
  sign: { originator: boolean; checker: boolean; approver: boolean }
  issue: boolean
}

function OpenRevision({
  line,
  moved,
  toAccept,
  may,
  pdf,
  params,
  time,
}: {
  line: PackageLine
  moved: boolean
  /** Warnings that nobody has accepted yet. */
  toAccept: { runId: number; runNumber: number; text: string }[]
  may: May
  pdf: string
  params: { projectId: string }
  time: ReturnType<typeof localTime>
}) {
  const drawing = useDrawing(params.projectId, line)
  const busy = useNavigation().state !== 'idle'
  const next =
    line.status === 'draft'
      ? 'originator'
      : line.status === 'shared for check'
        ? 'checker'
        : line.status === 'checked'
          ? 'approver'
          : null
  const person = { originator: 'the originator', checker: 'the checker', approver: 'the approver' } as const
  return (
    <div className="border border-rule px-4 py-3">
      <p className="text-[1.15rem]">
        <b className="font-semibold">{line.revision}</b> <span className="text-ochre">{line.status}</span>
        <span className="text-flint-2">: {statusMeaning[line.status]}</span>
      </p>
      <p className="mt-1">
        {line.reason} <span className="text-flint-2">For: {line.purpose}</span>
      </p>
      <ul className="mt-3 grid gap-1 sm:grid-cols-3">
        {(['originator', 'checker', 'approver'] as const).map((role) => {
          const signature = line.signatures.find((s) => s.role === role)
          return (
            <li key={role} className="border-l-[3px] border-rule pl-2.5 leading-snug">
              <span className="text-[0.87rem] text-flint-2">{role}</span>
              <br />
              {signature ? (
                <>
                  <b className="font-semibold">{signature.name}</b>, {time.minute(signature.at)}
                </>
              ) : (
                <span className="text-flint-2">not signed</span>
              )}
            </li>
          )
        })}
      </ul>
      {moved && (
        <Notice tone="warn" title="The book has changed since this revision was gathered.">
          It must be gathered again before anybody signs; signatures given so far fall.
        </Notice>
      )}
      {toAccept.length > 0 && (
        <Notice
          tone="warn"
          title={
            toAccept.length === 1
              ? 'A warning waits to be accepted before anybody signs.'
              : `${toAccept.length} warnings wait to be accepted before anybody signs.`
          }
        >
          <ul>
            {toAccept.map(({ runId, runNumber, text }) => (
              <li key={`${runId} ${text}`} className="mt-1">
                <Link to={`${href('/projects/:projectId/heads', params)}?run=${runId}`} className="underline">
                  Run {runNumber}, section 5
                </Link>
                : {text}
              </li>
            ))}
          </ul>
        </Notice>
      )}
      {drawing.failed && (
        <Notice tone="alarm" title="The drawing failed." live>
          {drawing.failed}
        </Notice>
      )}
      <div className="mt-4 flex flex-wrap items-start gap-2.5">
        {drawing.active ? (
          <output className="self-center text-flint-2">Drawing the PDF…</output>
        ) : (
          line.hasPdf && (
            <DownloadButton href={pdf} download>
              {line.revision} PDF
            </DownloadButton>
          )
        )}
        <Form method="post" className="contents">
          <input type="hidden" name="packageId" value={line.id} />
          <input type="hidden" name="inputSha256" value={line.inputSha256 ?? ''} />
          {next && may.sign[next] && (
            <Button
              type="submit"
              look="primary"
              name="intent"
              value={`sign ${next}`}
              disabled={busy || moved || toAccept.length > 0 || drawing.active}
            >
              Sign as {next}
            </Button>
          )}
          {may.issue && line.status === 'approved' && (
            <Button
              type="submit"
              look="primary"
              name="intent"
              value="issue"
              disabled={busy || moved || toAccept.length > 0 || drawing.active}
            >
              Issue {line.revision}
            </Button>
          )}
          {may.make && (
            <>
              <Button type="submit" name="intent" value="gather" disabled={busy || drawing.active}>
                Gather the book again
              </Button>
              <Confirm
                label="Withdraw"
                question={`${line.revision} will be kept as withdrawn, and its number is not used again.`}
                yes={`Withdraw ${line.revision}`}
                name="intent"
                value="withdraw"
                disabled={busy}
              />
            </>
          )}
        </Form>
      </div>
      {next && !may.sign[next] && (
        <p className="mt-3 text-[0.9rem] text-flint-2">The next move is with {person[next]}.</p>
      )}
      {line.status === 'approved' && !may.issue && (
        <p className="mt-3 text-[0.9rem] text-flint-2">
          The next move is with the project manager, who issues it.
        </p>
      )}
      {line.inputSha256 && (
        <p className="mt-3 text-[0.85rem] break-all text-flint-2">
          Signatures cover the input hash {line.inputSha256}
        </p>
      )}
    </div>
  )
}

/** Asks every second while the PDF is being drawn, then reloads the page's data. */
function useDrawing(projectId: string, line: PackageLine) {
  const { revalidate } = useRevalidator()
  const [state, setState] = useState<{ active: boolean; failed: string | null }>({
    active: line.drawing,
    failed: null,
  })
  useEffect(() => {
    if (!line.drawing) {
      setState((before) => ({ ...before, active: false }))
      return
    }
    let over = false
    const url = href('/projects/:projectId/packages/:packageId', { projectId, packageId: String(line.id) })
    async function look() {
      const response = await fetch(url)
      if (over || !response.ok) return
      const answer = (await response.json()) as { drawing: boolean; failed: string | null }
      if (over) return
      setState({ active: answer.drawing, failed: answer.failed })
      if (answer.drawing) setTimeout(() => void look(), 1000)
      else void revalidate()
    }
    setState((before) => ({ ...before, active: true }))
    void look()
    return () => {
      over = true
    }
  }, [projectId, line.id, line.drawing, revalidate])
  return state
}

function NewRevision({
  runs,
  result,
}: {
  runs: { id: number; number: number; caseName: string; stale: boolean }[]
  result: SubmissionResult<string[]> | undefined
}) {
  const [form, fields] = useForm({
    lastResult: result,
    shouldValidate: 'onBlur',
    onValidate: ({ formData }) => parseWithZod(formData, { schema: newPackageSchema }),
  })
  const busy = useNavigation().state !== 'idle'
  if (runs.length === 0) {
    return (
      <Notice tone="warn" title="A package needs a run that has converged: run a case in section 4 first." />
    )
  }
  return (
    <Form
      method="post"
      id={form.id}
      onSubmit={form.onSubmit}
      noValidate
      className="mt-4 grid max-w-2xl gap-4 sm:grid-cols-2"
    >
      <div className="sm:col-span-2 empty:hidden">
        <FormMessage result={result} />
      </div>
      <SelectField label="Run of record" key={fields.runId.key} {...fieldProps(fields.runId)}>
        {runs.map((run) => (
          <option key={run.id} value={run.id}>
            run {run.number}, {run.caseName}
            {run.stale ? ' (inputs changed since)' : ''}
          </option>
        ))}
      </SelectField>
      <SelectField
        label="Drawdown against"
        key={fields.againstRunId.key}
        {...fieldProps(fields.againstRunId)}
      >
        <option value="">no other run</option>
        {runs.map((run) => (
          <option key={run.id} value={run.id}>
            run {run.number}, {run.caseName}
          </option>
        ))}
      </SelectField>
      <Field
        label="Readings of"
        type="date"
        hint="Fit: the reading nearest to this day. Leave empty for the latest."
        key={fields.fitDate.key}
        {...fieldProps(fields.fitDate)}
      />
      <Field
        label="Issued for"
        key={fields.purpose.key}
        {...fieldProps(fields.purpose)}
        placeholder="Approval of the dewatering scheme"
      />
      <div className="sm:col-span-2">
        <Field label="What is new in this revision" key={fields.reason.key} {...fieldProps(fields.reason)} />
      </div>
      <div>
        <Button type="submit" look="primary" name="intent" value="make" disabled={busy}>
          Make the revision
        </Button>
      </div>
    </Form>
  )
}
