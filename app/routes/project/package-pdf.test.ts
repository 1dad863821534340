import { RouterContextProvider } from 'react-router'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { putBuffer, recordFile } from '~/files/files.server'
import type { PackageStatus } from '~/packages/title-block'
import { membershipContext } from '~/projects/guard.server'
import type { Role } from '~/projects/permissions'
import type { Project } from '~/projects/project'
import { findProject } from '~/projects/projects.server'
import { type FreshDatabase, freshDatabase } from '../../../test/database'
import { makePerson, makeProject } from '../../../test/people'
import { loader } from './package-pdf'

let fresh: FreshDatabase
let project: Project
let userId = 0
const packages = new Map<PackageStatus, number>()

beforeAll(async () => {
  fresh = await freshDatabase()
  userId = await makePerson(fresh.database, { name: 'M. Alder' })
  const projectId = await makeProject(fresh.database, { number: 'P-1', createdBy: userId })
  project = (await findProject(fresh.database, projectId)) as Project
  const statuses: PackageStatus[] = [
    'superseded',
    'issued',
    'draft',
    'shared for check',
    'checked',
    'approved',
    'withdrawn',
  ]
  for (const [index, status] of statuses.entries()) {
    const stored = await putBuffer(Buffer.from(`%PDF-1.3 ${status}`), {
      folder: `projects/${projectId}/packages`,
      contentType: 'application/pdf',
    })
    const fileId = await recordFile(fresh.database, {
      projectId,
      kind: 'package',
      name: `C-P-1 P0${index + 1}.pdf`,
      contentType: 'application/pdf',
      stored,
      userId,
    })
    const [id] = await fresh.database('packages').insert({
      project_id: projectId,
      revision: `P0${index + 1}`,
      status,
      purpose: 'Approval',
      reason: 'First issue',
      file_id: fileId,
      pdf_sha256: stored.sha256,
      created_at: new Date(),
      created_by: userId,
    })
    packages.set(status, id ?? 0)
  }
})
afterAll(() => fresh.close())

async function fetched(role: Role, status: PackageStatus, of: Project = project): Promise<Response> {
  const context = new RouterContextProvider()
  context.set(membershipContext, {
    project: of,
    member: { userId, name: 'M. Alder', role },
    user: { userId, name: 'M. Alder' } as never,
  })
  const params = { projectId: String(of.id), packageId: String(packages.get(status)) }
  return loader({ context, params } as never)
}

describe('The PDF of a revision', () => {
  it.each(['issued', 'superseded'] as const)(
    'is there for the client once it has been %s',
    async (status) => {
      const response = await fetched('client', status)
      expect(await response.text()).toBe(`%PDF-1.3 ${status}`)
      expect(response.headers.get('content-disposition')).toMatch(/^attachment/)
      expect(response.headers.get('x-content-type-options')).toBe('nosniff')
    },
  )

  it.each(['draft', 'shared for check', 'checked', 'approved', 'withdrawn'] as const)(
    'is there for the team and not for the client while it is %s',
    async (status) => {
      await expect(fetched('client', status)).rejects.toMatchObject({ status: 404 })
      for (const role of ['project manager', 'originator', 'checker', 'approver', 'data'] as const) {
        expect((await fetched(role, status)).status).toBe(200)
      }
    },
  )

  it('is not there under the number of another project', async () => {
    const other = { ...project, id: project.id + 1 }
    await expect(fetched('project manager', 'issued', other)).rejects.toMatchObject({ status: 404 })
  })
})
