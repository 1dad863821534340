import { createHash } from 'node:crypto'
import canonicalize from 'canonicalize'
import { digestOf, recordSection, sectionStates } from '~/book/sections.server'
import { environment } from '~/environment.server'
import { getVerified, putBuffer, recordFile } from '~/files/files.server'
import { notAccepted } from '~/heads/acceptance'
import { acceptancesOf } from '~/heads/acceptances.server'
import { mostBalanceError } from '~/heads/account'
import { findRun, isStale, runHeads } from '~/heads/runs.server'
import { cancelJob, enterJob, launchJob } from '~/jobs/jobs.server'
import { recordHistory } from '~/projects/history.server'
import type { Project } from '~/projects/project'
import type { Database } from '~database/connection.server'
import { gatherContent } from './gather.server'
import type { DrawRequest, GatheredContent, GatheredCover } from './gathered'
import { type NewPackage, nextRevision, type PackageLine, statusAfter } from './package'
import type { PackageStatus, Signature } from './title-block'
import { signaturesOf } from './title-block.server'

interface PackageRow {
  id: number
  project_id: number
  revision: string
  status: PackageStatus
  purpose: string
  reason: string
  run_id: number
  against_run_id: number | null
  fit_date: Date | null
  gathered: string | null
  input_sha256: string | null
  job_id: number | null
  file_id: number | null
  pdf_sha256: string | null
  created_at: Date
  created_by: number
  issued_at: Date | null
  issued_by: number | null
}

/** An answer that a page can print as it is. */
export type Outcome = { ok: true; packageId: number } | { ok: false; message: string }

/** Every section whose content a package prints. */
const printed = ['cover', 'basis', 'ground', 'water', 'cases', 'heads', 'readings', 'fit', 'checks'] as const

/** Revisions of the project's package, newest first. */
export async function listPackages(db: Database, projectId: number): Promise<PackageLine[]> {
  const rows = await db('packages')
    .join('users', 'users.id', 'packages.created_by')
    .leftJoin('runs', 'runs.id', 'packages.run_id')
    .leftJoin('jobs', 'jobs.id', 'packages.job_id')
    .where({ 'packages.project_id': projectId })
    .orderBy('packages.id', 'desc')
    .select<
      (Omit<PackageRow, 'gathered'> & {
        created_by_name: string
        run_number: number | null
        job_state: string | null
      })[]
    >(
      'packages.id',
      'packages.revision',
      'packages.status',
      'packages.purpose',
      'packages.reason',
      'packages.created_at',
      'packages.issued_at',
      'packages.pdf_sha256',
      'packages.input_sha256',
      'packages.file_id',
      'jobs.state as job_state',
      'users.name as created_by_name',
      'runs.number as run_number',
    )
  return Promise.all(
    rows.map(async (row) => ({
      id: row.id,
      revision: row.revision,
      status: row.status,
      purpose: row.purpose,
      reason: row.reason,
      runNumber: row.run_number,
      createdAt: row.created_at.toISOString(),
      createdBy: row.created_by_name,
      issuedAt: row.issued_at?.toISOString() ?? null,
      pdfSha256: row.pdf_sha256,
      inputSha256: row.input_sha256,
      hasPdf: row.file_id !== null,
      drawing: row.job_state === 'queued' || row.job_state === 'running',
      signatures: await signaturesOf(db, row.id),
    })),
  )
}

export async function findPackage(
  db: Database,
  projectId: number,
  packageId: number,
): Promise<PackageRow | undefined> {
  return db<PackageRow>('packages').where({ project_id: projectId, id: packageId }).first()
}

/** Why a run, and the one that it is compared with, cannot stand in a package; null when they can. */
async function runsObjection(
  db: Database,
  project: Project,
  ...runIds: readonly (number | null | undefined)[]
): Promise<string | null> {
  for (const runId of runIds) {
    const objection = runId ? await runObjection(db, project, runId) : null
    if (objection) return objection
  }
  return null
}

async function runObjection(db: Database, project: Project, runId: number): Promise<string | null> {
  const run = await findRun(db, project.id, runId)
  if (run?.state !== 'done' || !run.result) return 'Choose a run that has finished.'
  if (!run.converged) return `Run ${run.number} did not converge, so it cannot be packaged.`
  const error = run.result.balance.errorPercent.reduce((worst, one) => Math.max(worst, Math.abs(one)), 0)
  if (!(error <= mostBalanceError))
    return `The water balance of run ${run.number} is out by ${error} %, so it cannot be packaged.`
  const serious = run.result.warnings.find(({ severity }) => severity === 'serious')
  if (serious)
    return `Run ${run.number} is not to be used as it is, so it cannot be packaged: ${serious.text}`
  return null
}

/** What nobody has accepted yet of the warnings of a package's runs, that of its run of record first. */
export async function warningsToAccept(
  db: Database,
  projectId: number,
  runs: { run_id: number; against_run_id: number | null },
): Promise<{ runId: number; runNumber: number; text: string }[]> {
  const found = await Promise.all(
    [runs.run_id, runs.against_run_id].map((id) => (id ? findRun(db, projectId, id) : undefined)),
  )
  const waiting = found.map(async (run) =>
    run?.result
      ? notAccepted(run.result.warnings, await acceptancesOf(db, projectId, run.id)).map(
          ({ text: said }) => ({
            runId: run.id,
            runNumber: run.number,
            text: said,
          }),
        )
      : [],
  )
  return (await Promise.all(waiting)).flat()
}

/** Why nobody may sign or issue yet, as far as warnings go; null when all that need it are accepted, and printed so. */
async function acceptanceObjection(db: Database, projectId: number, row: PackageRow): Promise<string | null> {
  const [first, ...others] = await warningsToAccept(db, projectId, row)
  if (first) {
    const more = others.length > 0 ? ` (and ${others.length} more)` : ''
    return `Run ${first.runNumber} gives a warning that nobody has accepted yet, in section 5${more}: ${first.text}`
  }
  const content = row.gathered === null ? null : (JSON.parse(row.gathered) as GatheredContent)
  const printedOpen = [content?.run, content?.against].some(
    (run) => run && notAccepted(run.result.warnings, run.acceptances ?? []).length > 0,
  )
  return printedOpen
    ? 'A warning was accepted after this package was gathered: gather it again, so that it is printed.'
    : null
}

/**
 * Opens a new revision: gathers the book as it stands, freezes it with its SHA-256 and starts drawing.
 * Only one revision may be open at a time.
 */
export async function makePackage(
  db: Database,
  project: Project,
  input: NewPackage,
  userId: number,
): Promise<Outcome> {
  const objection = await runsObjection(db, project, input.runId, input.againstRunId)
  if (objection) return { ok: false, message: objection }
  // Before the content: what changes while it is gathered counts as moved, never as gathered.
  const sectionsDigest = await digestOf(db, project.id, printed)
  const frozen = freeze(await gatherContent(db, project, input))
  const made = await db.transaction(async (trx): Promise<Outcome> => {
    await trx('projects').where({ id: project.id }).forUpdate().first('id')
    const taken = await trx<PackageRow>('packages')
      .where({ project_id: project.id })
      .select('revision', 'status')
    const open = taken.find(
      (p) => p.status !== 'issued' && p.status !== 'superseded' && p.status !== 'withdrawn',
    )
    if (open)
      return {
        ok: false,
        message: `Revision ${open.revision} is still ${open.status}: finish or withdraw it first.`,
      }
    const revision = nextRevision(taken.map((p) => p.revision))
    const [id] = await trx('packages').insert({
      project_id: project.id,
      revision,
      status: 'draft',
      purpose: input.purpose,
      reason: input.reason,
      run_id: input.runId,
      against_run_id: input.againstRunId ?? null,
      fit_date: input.fitDate ? new Date(`${input.fitDate}T12:00:00Z`) : null,
      gathered: frozen.text,
      input_sha256: frozen.sha256,
      sections_digest: sectionsDigest,
      created_at: new Date(),
      created_by: userId,
    })
    if (id === undefined) throw new Error('The database returned no package id.')
    await noteChange(trx, project.id, userId, 'made package', revision, { input: frozen.sha256 })
    return { ok: true, packageId: id }
  })
  if (made.ok) await startDrawing(db, project, made.packageId, userId)
  return made
}

/** Takes the book as it stands into an open revision. Signatures fall, since they covered what was there before. */
export async function gatherAgain(
  db: Database,
  project: Project,
  packageId: number,
  userId: number,
): Promise<Outcome> {
  const row = await findPackage(db, project.id, packageId)
  if (!row || !isOpen(row.status))
    return { ok: false, message: 'Only an open revision can be gathered again.' }
  // Before the content: what changes while it is gathered counts as moved, never as gathered.
  const sectionsDigest = await digestOf(db, project.id, printed)
  const frozen = freeze(
    await gatherContent(db, project, {
      runId: row.run_id,
      againstRunId: row.against_run_id ?? undefined,
      fitDate: row.fit_date?.toISOString().slice(0, 10),
    }),
  )
  const gathered = await db.transaction(async (trx): Promise<Outcome> => {
    const now = await trx<PackageRow>('packages')
      .where({ id: packageId, project_id: project.id })
      .forUpdate()
      .first()
    // Gathering takes a while, in which the revision may have been issued: then it never changes again.
    if (now?.status !== row.status || now.input_sha256 !== row.input_sha256) {
      return {
        ok: false,
        message: 'Somebody else was quicker: the package has moved on. Nothing was gathered.',
      }
    }
    await trx('package_signatures').where({ package_id: packageId }).delete()
    await trx('packages').where({ id: packageId }).update({
      gathered: frozen.text,
      input_sha256: frozen.sha256,
      sections_digest: sectionsDigest,
      status: 'draft',
    })
    await noteChange(trx, project.id, userId, 'gathered package again', row.revision, {
      input: frozen.sha256,
    })
    return { ok: true, packageId }
  })
  if (gathered.ok) await startDrawing(db, project, packageId, userId)
  return gathered
}

function isOpen(status: PackageStatus): boolean {
  return status === 'draft' || status === 'shared for check' || status === 'checked' || status === 'approved'
}

function freeze(content: GatheredContent): { text: string; sha256: string } {
  const text = canonicalize(content)
  if (text === undefined) throw new Error('The gathered content cannot be written as JSON.')
  return { text, sha256: createHash('sha256').update(text).digest('hex') }
}

async function noteChange(
  trx: Database,
  projectId: number,
  userId: number,
  action: string,
  subject: string,
  after?: unknown,
): Promise<void> {
  const rows = await trx('packages')
    .where({ project_id: projectId })
    .orderBy('id')
    .select('id', 'status', 'input_sha256')
  await recordSection(trx, projectId, 'package', rows.length === 0 ? null : rows, userId)
  await recordHistory(trx, { projectId, userId, section: 'package', action, subject, after })
}

/** True when the book has moved on since the package was gathered. */
export async function bookHasMoved(db: Database, projectId: number, packageId: number): Promise<boolean> {
  const row = await db('packages')
    .where({ id: packageId, project_id: projectId })
    .first<{ sections_digest: string } | undefined>('sections_digest')
  return row !== undefined && row.sections_digest !== (await digestOf(db, projectId, printed))
}

/**
 * Signs an open revision; `seenSha256` is the input hash that the signer had before their eyes. Originator first, then
 * checker, then approver; the checker and the approver have made no part of it: neither the package, nor its run, nor
 * any row or import of the sections that it prints.
 */
export async function signPackage(
  db: Database,
  project: Project,
  packageId: number,
  role: Signature['role'],
  userId: number,
  seenSha256: string,
): Promise<Outcome> {
  const objection = await signObjection(db, project, packageId, role, userId)
  if (objection) return { ok: false, message: objection }
  const signed = await db.transaction(async (trx): Promise<Outcome> => {
    const row = await trx<PackageRow>('packages')
      .where({ id: packageId, project_id: project.id })
      .forUpdate()
      .first()
    if (!row || row.status !== statusAfter[role].from) {
      return { ok: false, message: 'Somebody else was quicker: the package has another status now.' }
    }
    if (row.input_sha256 !== seenSha256) {
      return { ok: false, message: 'The package was gathered again meanwhile: read it before you sign.' }
    }
    await trx('package_signatures').insert({
      package_id: packageId,
      role,
      user_id: userId,
      signed_sha256: row.input_sha256,
      signed_at: new Date(),
    })
    await trx('packages').where({ id: packageId }).update({ status: statusAfter[role].to })
    await noteChange(trx, project.id, userId, `signed as ${role}`, row.revision, { signed: row.input_sha256 })
    return { ok: true, packageId }
  })
  // The cover shows who has signed, so the working copy is drawn again.
  if (signed.ok) await startDrawing(db, project, packageId, userId)
  return signed
}

async function signObjection(
  db: Database,
  project: Project,
  packageId: number,
  role: Signature['role'],
  userId: number,
): Promise<string | null> {
  const row = await findPackage(db, project.id, packageId)
  if (!row) return 'This package is no longer there.'
  if (row.status !== statusAfter[role].from) {
    return `A package that is ${row.status} cannot be signed as ${role}: it must be ${statusAfter[role].from}.`
  }
  if (await bookHasMoved(db, project.id, packageId)) {
    return 'The book has changed since this package was gathered: gather it again before anybody signs.'
  }
  const run = await findRun(db, project.id, row.run_id)
  if (!run) return 'The run of this package is no longer there.'
  if (await isStale(db, project, run)) {
    return `The inputs have changed since run ${run.number}: run the case again and gather again.`
  }
  const objection =
    (await runsObjection(db, project, row.run_id, row.against_run_id)) ??
    (await acceptanceObjection(db, project.id, row))
  if (objection) return objection
  if (role === 'originator') return null
  if (await hasMadeAnyOf(db, project.id, packageId, row.run_id, userId)) {
    return `You made part of this package, so somebody else must be its ${role}.`
  }
  if (role === 'checker') {
    const states = await sectionStates(db, project.id)
    const waiting = states.filter(
      (s) => printed.some((key) => key === s.key) && s.state !== 'empty' && s.state !== 'checked',
    )
    if (waiting.length > 0) {
      return `Check these sections first: ${waiting.map((s) => `${s.key} (${s.state})`).join(', ')}.`
    }
  }
  return null
}

async function hasMadeAnyOf(
  db: Database,
  projectId: number,
  packageId: number,
  runId: number,
  userId: number,
): Promise<boolean> {
  const found = await Promise.all([
    db('packages').where({ id: packageId, created_by: userId }).first('id'),
    db('runs').where({ id: runId, created_by: userId }).first('id'),
    db('book_rows').where({ project_id: projectId, recorded_by: userId }).first('id'),
    db('imports').where({ project_id: projectId, state: 'committed', committed_by: userId }).first('id'),
    db('package_signatures')
      .where({ package_id: packageId, user_id: userId, role: 'originator' })
      .first('package_id'),
  ])
  return found.some(Boolean)
}

/**
 * Issues an approved package: draws it once more with its signatures and without the watermark, stores that PDF for
 * good, and supersedes the revision issued before. Returns when drawing has begun; the status changes when it is done.
 */
export async function issuePackage(
  db: Database,
  project: Project,
  packageId: number,
  userId: number,
  now = new Date(),
): Promise<Outcome> {
  const row = await findPackage(db, project.id, packageId)
  if (!row) return { ok: false, message: 'This package is no longer there.' }
  if (row.status !== 'approved')
    return { ok: false, message: `A package that is ${row.status} cannot be issued.` }
  const signatures = await db('package_signatures')
    .where({ package_id: packageId })
    .select('role', 'user_id', 'signed_sha256')
  const by = (role: string) => signatures.find((s) => s.role === role)
  const originator = by('originator')
  const checker = by('checker')
  const approver = by('approver')
  if (!originator || !checker || !approver)
    return { ok: false, message: 'Originator, checker and approver must all have signed.' }
  if (checker.user_id === originator.user_id || approver.user_id === originator.user_id) {
    return { ok: false, message: 'Checker and approver must not be the originator.' }
  }
  if (signatures.some((s) => s.signed_sha256 !== row.input_sha256)) {
    return {
      ok: false,
      message: 'A signature covers another content than this package holds: gather and sign again.',
    }
  }
  if (await bookHasMoved(db, project.id, packageId)) {
    return { ok: false, message: 'The book has changed since this package was gathered: gather it again.' }
  }
  const objection =
    (await runsObjection(db, project, row.run_id, row.against_run_id)) ??
    (await acceptanceObjection(db, project.id, row))
  if (objection) return { ok: false, message: objection }
  const under =
    row.job_id &&
    (await db('jobs').where({ id: row.job_id }).whereIn('state', ['queued', 'running']).first('id'))
  if (under) return { ok: false, message: 'The package is being drawn: wait until that is done.' }
  await startDrawing(db, project, packageId, userId, now)
  return { ok: true, packageId }
}

/** Withdraws an open revision; its number is not used again. */
export async function withdrawPackage(
  db: Database,
  project: Project,
  packageId: number,
  userId: number,
): Promise<Outcome> {
  return db.transaction(async (trx): Promise<Outcome> => {
    const row = await trx<PackageRow>('packages')
      .where({ id: packageId, project_id: project.id })
      .forUpdate()
      .first()
    if (!row || !isOpen(row.status)) return { ok: false, message: 'Only an open revision can be withdrawn.' }
    await trx('packages').where({ id: packageId }).update({ status: 'withdrawn' })
    await noteChange(trx, project.id, userId, 'withdrew package', row.revision)
    return { ok: true, packageId }
  })
}

/** Draws the PDF of a revision off the request thread; `issuing` makes it the one that is issued. */
export async function startDrawing(
  db: Database,
  project: Project,
  packageId: number,
  userId: number,
  issuing?: Date,
): Promise<number> {
  const row = await findPackage(db, project.id, packageId)
  if (!row?.gathered || !row.input_sha256) throw new Error(`Package ${packageId} holds nothing to draw.`)
  const content = JSON.parse(row.gathered) as GatheredContent
  const cover = await gatherCover(db, project, row, issuing)
  const heads = await runHeads(db, project.id, row.run_id)
  if (!heads) throw new Error(`The head field of package ${packageId} is not there.`)
  const against = row.against_run_id ? await runHeads(db, project.id, row.against_run_id) : null
  const request: DrawRequest = {
    content,
    cover,
    heads: new Uint8Array(heads),
    againstHeads: against ? new Uint8Array(against) : null,
  }
  const jobId = await db.transaction(async (trx) => {
    const entered = await enterJob(trx, { projectId: project.id, userId, kind: 'draw' })
    await trx('packages').where({ id: packageId }).update({ job_id: entered })
    return entered
  })
  // What was being drawn until now is out of date.
  if (row.job_id !== null) await cancelJob(row.job_id)
  launchJob<{ pdf: ArrayBuffer }>(jobId, {
    projectId: project.id,
    userId,
    kind: 'draw',
    workerData: { request },
    onDone: async ({ pdf }) =>
      storePdf(db, project, { packageId, userId, jobId, issuing, pdf: new Uint8Array(pdf) }),
  })
  return jobId
}

async function gatherCover(
  db: Database,
  project: Project,
  row: PackageRow,
  issuing?: Date,
): Promise<GatheredCover> {
  const maker = await db('users').where({ id: row.created_by }).first<{ name: string }>('name')
  const cover = await db('book_rows')
    .where({ project_id: project.id, kind: 'cover' })
    .whereNull('recorded_to')
    .first<{ body: unknown } | undefined>('body')
  const body = (typeof cover?.body === 'string' ? JSON.parse(cover.body) : cover?.body) as
    | { distribution?: string }
    | undefined
  const revisions = await db<PackageRow>('packages')
    .where({ project_id: project.id })
    .where('id', '<=', row.id)
    .orderBy('id', 'desc')
    .select('id', 'revision', 'status', 'reason', 'issued_at')
  return {
    revision: row.revision,
    status: issuing ? 'issued' : row.status,
    purpose: row.purpose,
    reason: row.reason,
    madeBy: maker.name,
    madeAt: row.created_at.toISOString(),
    issuedAt: issuing?.toISOString() ?? null,
    distribution: body?.distribution ?? '',
    inputSha256: row.input_sha256 ?? '',
    signatures: await signaturesOf(db, row.id),
    revisions: revisions.map((r) => ({
      revision: r.revision,
      status:
        r.id === row.id && issuing ? 'issued' : r.status === 'issued' && issuing ? 'superseded' : r.status,
      reason: r.reason,
      issuedAt: (r.id === row.id ? issuing : r.issued_at)?.toISOString() ?? null,
    })),
    sections: (await sectionStates(db, project.id))
      .filter((s) => s.key !== 'package')
      .map((s) => ({
        key: s.key,
        state: s.state,
        checkedBy: s.checkedBy,
        checkedAt: s.checkedAt?.toISOString() ?? null,
      })),
    address: `${environment().address}/projects/${project.id}/package`,
  }
}

async function storePdf(
  db: Database,
  project: Project,
  drawn: { packageId: number; userId: number; jobId: number; issuing?: Date; pdf: Uint8Array },
): Promise<void> {
  const { packageId, userId, jobId, issuing, pdf } = drawn
  const row = await findPackage(db, project.id, packageId)
  if (!row) throw new Error(`Package ${packageId} is no longer there.`)
  // Somebody signed, gathered again or issued while this one was drawn: the later drawing is the one that counts.
  if (row.job_id !== jobId) return
  const stored = await putBuffer(pdf, {
    folder: `projects/${project.id}/packages`,
    contentType: 'application/pdf',
  })
  await db.transaction(async (trx) => {
    const name = `${project.calcReference} ${row.revision}${issuing ? '' : ` ${row.status}`}.pdf`
    const fileId = await recordFile(trx, {
      projectId: project.id,
      kind: 'package',
      name,
      contentType: 'application/pdf',
      stored,
      userId,
    })
    const open = trx('packages')
      .where({ id: packageId })
      .whereIn('status', ['draft', 'shared for check', 'checked', 'approved'])
    if (!issuing) {
      await open.update({ file_id: fileId, pdf_sha256: stored.sha256 })
      return
    }
    await trx('packages').where({ project_id: project.id, status: 'issued' }).update({ status: 'superseded' })
    const changed = await open.where({ status: 'approved' }).update({
      file_id: fileId,
      pdf_sha256: stored.sha256,
      status: 'issued',
      issued_at: issuing,
      issued_by: userId,
    })
    if (changed === 0)
      throw new Error(`Revision ${row.revision} is no longer approved, so it was not issued.`)
    await noteChange(trx, project.id, userId, 'issued package', row.revision, { pdf: stored.sha256 })
  })
}

/** The stored PDF of a revision, held against its SHA-256; undefined when none has been drawn. */
export async function packagePdf(
  db: Database,
  projectId: number,
  packageId: number,
): Promise<{ name: string; bytes: Buffer; sha256: string; status: PackageStatus } | undefined> {
  const row = await findPackage(db, projectId, packageId)
  if (!row?.file_id) return undefined
  const file = await db('files')
    .where({ id: row.file_id, project_id: projectId })
    .first<{ name: string; s3_key: string; sha256: string } | undefined>('name', 's3_key', 'sha256')
  if (!file) return undefined
  return {
    name: file.name,
    bytes: await getVerified(file.s3_key, file.sha256),
    sha256: file.sha256,
    status: row.status,
  }
}

/** What the latest issued package holds, or undefined while nothing has been issued. */
export async function issuedContent(db: Database, projectId: number): Promise<GatheredContent | undefined> {
  const row = await db<PackageRow>('packages')
    .where({ project_id: projectId, status: 'issued' })
    .orderBy('id', 'desc')
    .first('gathered')
  return row?.gathered ? (JSON.parse(row.gathered) as GatheredContent) : undefined
}
