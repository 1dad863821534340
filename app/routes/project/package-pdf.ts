import { downloadHeaders } from '~/files/files.server'
import { packagePdf } from '~/packages/packages.server'
import { idFrom, membershipContext, notFound } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import { database } from '~database/connection.server'
import type { Route } from './+types/package-pdf'

/** The PDF of a revision: a client gets issued and superseded ones, the team all. */
export async function loader({ context, params }: Route.LoaderArgs) {
  const { project, member } = context.get(membershipContext)
  const pdf = await packagePdf(database(), project.id, idFrom(params.packageId))
  if (!pdf) throw notFound()
  const wasIssued = pdf.status === 'issued' || pdf.status === 'superseded'
  if (!can(member, 'view', wasIssued ? 'issued package' : 'draft package')) throw notFound()
  const headers = downloadHeaders({ name: pdf.name, content_type: 'application/pdf' })
  headers.set('ETag', `"${pdf.sha256}"`)
  headers.set('Cache-Control', 'private, no-cache')
  return new Response(new Uint8Array(pdf.bytes), { headers })
}
