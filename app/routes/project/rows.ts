import { z } from 'zod'
import { list } from '~/book/list'
import { saveRows } from '~/book/rows.server'
import { limitedText, parseJson } from '~/json-body.server'
import { membershipContext, notFound } from '~/projects/guard.server'
import { can, type Subject } from '~/projects/permissions'
import { rowKinds } from '~/row-kinds.server'
import { requireSameOrigin } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/rows'

const mostBytes = 2 * 1024 * 1024

const id = z.string().regex(/^[A-Za-z0-9-]{1,36}$/)
const version = z.number().int().positive()
const kind = z.string().max(40)
const requestSchema = z.strictObject({
  changes: list(
    z.discriminatedUnion('op', [
      z.strictObject({ op: z.literal('add'), kind, id, body: z.unknown() }),
      z.strictObject({ op: z.literal('edit'), kind, id, version, body: z.unknown() }),
      z.strictObject({ op: z.literal('delete'), kind, id, version, alsoElsewhere: z.boolean().optional() }),
    ]),
    { least: 1, most: 1000 },
  ).refine(
    (changes) => new Set(changes.map((change) => change.id)).size === changes.length,
    'One change a row.',
  ),
  reason: z.string().trim().max(500).optional(),
})

function refusal(status: number, error: string): Response {
  return Response.json({ error }, { status })
}

/** Rows are saved here and read by each section's page. */
export function loader(): never {
  throw refusal(405, 'Rows are saved by POST.')
}

/**
 * Saves changes to controlled rows of any section: JSON { changes: RowChange[], reason? }.
 * Answers 200 with the new versions, 400 with what is wrong in which cell, 409 with both values of each row that
 * somebody else has changed meanwhile, 403 naming the section that the role may not edit.
 */
export async function action({ request, context }: Route.ActionArgs) {
  requireSameOrigin(request)
  const { project, member, user } = context.get(membershipContext)
  if (!can(member, 'view', 'book')) throw notFound()
  if (request.method !== 'POST') return refusal(405, 'Rows are saved by POST.')
  if (!request.headers.get('content-type')?.startsWith('application/json')) {
    return refusal(415, 'Rows are sent as JSON.')
  }
  const text = await limitedText(request, mostBytes)
  if (text === null) return refusal(413, 'This is too much for one save: 2 MB at most.')
  const read = requestSchema.safeParse(parseJson(text))
  if (!read.success) {
    return refusal(400, `The request could not be read: ${read.error.issues[0]?.message ?? 'no JSON'}`)
  }
  const { changes, reason } = read.data
  for (const change of changes) {
    const section = Object.hasOwn(rowKinds, change.kind) ? rowKinds[change.kind]?.section : undefined
    if (section && !can(member, 'edit', section as Subject<'edit'>)) {
      return refusal(403, `your role (${member.role}) may not edit ${section}`)
    }
  }
  const answer = await saveRows(database(), {
    projectId: project.id,
    userId: user.userId,
    changes,
    kinds: rowKinds,
    reason,
  })
  const status = answer.ok ? 200 : answer.conflicts.length > 0 ? 409 : 400
  return Response.json(answer, { status })
}
