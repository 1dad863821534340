import type { Database } from '~database/connection.server'
import type { PackageStatus, Signature, TitleBlockFacts } from './title-block'

/** The latest revision of the package and who has signed it: what the title block of every page shows. */
export async function titleBlockFacts(db: Database, projectId: number): Promise<TitleBlockFacts> {
  const latest = await db('packages')
    .where({ project_id: projectId })
    .orderBy('id', 'desc')
    .first<{ id: number; revision: string; status: PackageStatus } | undefined>('id', 'revision', 'status')
  if (!latest) return { revision: null, status: null, signatures: [] }
  return { revision: latest.revision, status: latest.status, signatures: await signaturesOf(db, latest.id) }
}

/** Signatures of one package, in the order in which they were given. */
export async function signaturesOf(db: Database, packageId: number): Promise<Signature[]> {
  const rows = await db('package_signatures')
    .join('users', 'users.id', 'package_signatures.user_id')
    .where({ package_id: packageId })
    .orderBy('signed_at')
    .select<{ role: Signature['role']; name: string; signed_at: Date }[]>('role', 'users.name', 'signed_at')
  return rows.map((row) => ({ role: row.role, name: row.name, at: row.signed_at.toISOString() }))
}
