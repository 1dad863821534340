import { execFileSync } from 'node:child_process'
import { createHash } from 'node:crypto'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { checkSection, sectionStates } from '~/book/sections.server'
import { acceptWarnings } from '~/heads/acceptances.server'
import { findRun } from '~/heads/runs.server'
import { findJob, jobEnded } from '~/jobs/jobs.server'
import type { Project } from '~/projects/project'
import { formatNumber } from '~/units'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson } from '../../test/people'
import { add, makeStrip, type Strip, stripWell } from '../../test/strip'
import {
  bookHasMoved,
  findPackage,
  gatherAgain,
  issuedContent,
  issuePackage,
  listPackages,
  makePackage,
  packagePdf,
  signPackage,
  warningsToAccept,
  withdrawPackage,
} from './packages.server'
import type { Signature } from './title-block'

let fresh: FreshDatabase
let strip: Strip
let project: Project
const people = { manager: 0, originator: 0, checker: 0, approver: 0 }
let runId = 0
let wellVersion = 1

/** Pumps another rate, and computes the case with it. */
async function pump(rate: number) {
  const edit = { op: 'edit', kind: 'well', id: strip.ids.well, version: wellVersion } as const
  await strip.save([{ ...edit, body: stripWell(rate) }])
  wellVersion += 1
  runId = (await strip.compute()).id
}

async function checkEverything() {
  for (const { key, state, digest } of await sectionStates(fresh.database, project.id)) {
    if (state !== 'empty' && key !== 'package') {
      await checkSection(fresh.database, project.id, key, people.checker, digest)
    }
  }
}

const order = (reason = 'First issue') => ({ runId, purpose: 'Approval of the pumping', reason })

async function made(reason?: string): Promise<number> {
  const outcome = await makePackage(fresh.database, project, order(reason), people.manager)
  if (!outcome.ok) throw new Error(outcome.message)
  return outcome.packageId
}

async function found(packageId: number) {
  const row = await findPackage(fresh.database, project.id, packageId)
  if (!row) throw new Error('The package is gone.')
  return row
}

/** Waits until the PDF is drawn. */
async function drawn(packageId: number) {
  const { job_id } = await found(packageId)
  await jobEnded(job_id ?? 0)
  expect(await findJob(job_id ?? 0)).toMatchObject({ state: 'done', error: null })
}

async function sign(packageId: number, role: Signature['role'], userId: number = people[role]) {
  const seen = (await found(packageId)).input_sha256 ?? ''
  return signPackage(fresh.database, project, packageId, role, userId, seen)
}

async function signedByAll(packageId: number) {
  await checkEverything()
  for (const role of ['originator', 'checker', 'approver'] as const) {
    expect(await sign(packageId, role)).toMatchObject({ ok: true })
  }
  await drawn(packageId)
}

beforeAll(async () => {
  fresh = await freshDatabase()
  people.manager = await makePerson(fresh.database, { name: 'M. Alder' })
  people.originator = await makePerson(fresh.database, { name: 'O. Birch' })
  people.checker = await makePerson(fresh.database, { name: 'C. Cedar' })
  people.approver = await makePerson(fresh.database, { name: 'A. Damson' })
  strip = await makeStrip(fresh.database, { number: 'P-1', originator: people.originator })
  project = strip.project
  await pump(100)
}, 120_000)
afterAll(() => fresh.close())

// The tests tell one story: each goes on where the one before stopped.
describe('A revision of the package', { timeout: 240_000 }, () => {
  let first = 0
  let second = 0

  it('is made of a finished run of the project, and of no other', async () => {
    const refused = await makePackage(fresh.database, project, { ...order(), runId: 9999 }, people.manager)
    expect(refused).toEqual({ ok: false, message: 'Choose a run that has finished.' })
    first = await made()
    expect(await found(first)).toMatchObject({ revision: 'P01', status: 'draft' })
    const { gathered, input_sha256 } = await found(first)
    expect(
      createHash('sha256')
        .update(gathered ?? '')
        .digest('hex'),
    ).toBe(input_sha256)
  })

  it('is the only one that is open', async () => {
    const another = await makePackage(fresh.database, project, order(), people.manager)
    expect(another).toMatchObject({ ok: false, message: expect.stringContaining('P01 is still draft') })
  })

  it('is signed in order: originator, then checker, then approver', async () => {
    await checkEverything()
    expect(await sign(first, 'checker')).toMatchObject({ ok: false })
    expect(await sign(first, 'approver')).toMatchObject({ ok: false })
    expect(await sign(first, 'originator')).toMatchObject({ ok: true })
    expect((await found(first)).status).toBe('shared for check')
    expect(await sign(first, 'originator')).toMatchObject({ ok: false })
    expect(await sign(first, 'approver')).toMatchObject({ ok: false })
  })

  it('is not checked or approved by somebody who made a part of it', async () => {
    for (const maker of [people.originator, people.manager]) {
      expect(await sign(first, 'checker', maker)).toEqual({
        ok: false,
        message: 'You made part of this package, so somebody else must be its checker.',
      })
    }
    expect(await sign(first, 'checker')).toMatchObject({ ok: true })
    expect(await sign(first, 'approver', people.originator)).toMatchObject({ ok: false })
  })

  it('is not signed for a content that the signer has not seen', async () => {
    expect(
      await signPackage(fresh.database, project, first, 'approver', people.approver, 'f'.repeat(64)),
    ).toMatchObject({ ok: false, message: expect.stringContaining('gathered again meanwhile') })
  })

  it('is not issued before everybody has signed', async () => {
    expect(await issuePackage(fresh.database, project, first, people.manager)).toMatchObject({ ok: false })
    expect(await sign(first, 'approver')).toMatchObject({ ok: true })
    // A row of the database alone does not make an approval.
    await drawn(first)
    const [signature] = await fresh
      .database('package_signatures')
      .where({ package_id: first, role: 'checker' })
    await fresh.database('package_signatures').where({ package_id: first, role: 'checker' }).delete()
    expect(await issuePackage(fresh.database, project, first, people.manager)).toMatchObject({
      ok: false,
      message: expect.stringContaining('must all have signed'),
    })
    await fresh.database('package_signatures').insert({ ...signature, signed_sha256: 'e'.repeat(64) })
    expect(await issuePackage(fresh.database, project, first, people.manager)).toMatchObject({
      ok: false,
      message: expect.stringContaining('covers another content'),
    })
    await fresh.database('package_signatures').where({ package_id: first, role: 'checker' }).delete()
    await fresh.database('package_signatures').insert(signature)
  })

  it('is issued with a PDF whose SHA-256 is on record', async () => {
    expect((await found(first)).status).toBe('approved')
    expect(await issuePackage(fresh.database, project, first, people.manager)).toMatchObject({ ok: true })
    await drawn(first)
    const row = await found(first)
    expect(row).toMatchObject({ status: 'issued', issued_by: people.manager })
    const pdf = await packagePdf(fresh.database, project.id, first)
    expect(pdf?.bytes.subarray(0, 5).toString()).toBe('%PDF-')
    const sha256 = createHash('sha256')
      .update(pdf?.bytes ?? '')
      .digest('hex')
    expect([row.pdf_sha256, pdf?.sha256]).toEqual([sha256, sha256])
    expect(await packagePdf(fresh.database, project.id + 1, first)).toBeUndefined()
  })

  it('prints the water balance and the heads at named points as the database has them', async () => {
    const run = await findRun(fresh.database, project.id, runId)
    const pdf = await packagePdf(fresh.database, project.id, first)
    const text = execFileSync('pdftotext', ['-layout', '-', '-'], { input: pdf?.bytes, encoding: 'utf8' })
    const result = run?.result
    if (!result) throw new Error('The run has a result.')
    const { balance, boundaries, points, wells } = result
    expect(boundaries.map((part) => part.name)).toEqual(['West', 'East'])
    for (const { name, inflow, outflow } of [...boundaries, { ...balance, name: 'Total' }]) {
      const [into, out] = [inflow, outflow].map((rate) => formatNumber(rate[0], 2).replace('.', '\\.'))
      expect(text).toMatch(new RegExp(`^ *${name}\\b.* ${into} +${out}$`, 'm'))
    }
    expect(text).toContain(`error ${formatNumber(balance.errorPercent[0])} % of the inflow`)
    expect(points).toHaveLength(1)
    for (const { name, head, band } of points) {
      const [low, high] = band?.[0] ?? [Number.NaN, Number.NaN]
      const printed = [formatNumber(head[0], 3), `${formatNumber(low, 3)} to ${formatNumber(high, 3)}`]
      expect(text).toMatch(new RegExp(`^ *${name} +${printed.join(' +').replaceAll('.', '\\.')}$`, 'm'))
    }
    expect(text).toMatch(new RegExp(`^ *W1 +100 +100 +${formatNumber(wells[0]?.cellHead[0], 2)}`, 'm'))
    expect(text).toContain(run?.inputSha256)
    expect(text).toContain(run?.headsSha256)
  })

  it('never changes once it is issued', async () => {
    const before = await found(first)
    const refusals = [
      await gatherAgain(fresh.database, project, first, people.originator),
      await withdrawPackage(fresh.database, project, first, people.manager),
      await sign(first, 'approver'),
      await issuePackage(fresh.database, project, first, people.manager),
    ]
    for (const refusal of refusals) expect(refusal.ok).toBe(false)
    await pump(150)
    expect(await found(first)).toEqual(before)
    const content = await issuedContent(fresh.database, project.id)
    expect(content?.wells[0]?.rate).toEqual({ value: 100, unit: 'm3/d' })
  })

  it('is not signed after the book has moved on, until it is gathered again', async () => {
    second = await made('More water')
    expect((await found(second)).revision).toBe('P02')
    expect(await bookHasMoved(fresh.database, project.id, second)).toBe(false)
    expect(await sign(second, 'originator')).toMatchObject({ ok: true })
    await strip.save([add('point', { name: 'P2', x: 700, y: 300 })])
    expect(await bookHasMoved(fresh.database, project.id, second)).toBe(true)
    await checkEverything()
    expect(await sign(second, 'checker')).toMatchObject({
      ok: false,
      message: expect.stringContaining('has changed since'),
    })
    await gatherAgain(fresh.database, project, second, people.originator)
    expect((await found(second)).status).toBe('draft')
    expect((await listPackages(fresh.database, project.id))[0]?.signatures).toEqual([])
    // The run does not know the new point.
    expect(await sign(second, 'originator')).toMatchObject({
      ok: false,
      message: expect.stringContaining('inputs have changed since run'),
    })
  })

  it('keeps its number when it is withdrawn, and is not opened by a gathering that began before', async () => {
    const gathering = gatherAgain(fresh.database, project, second, people.originator)
    expect(await withdrawPackage(fresh.database, project, second, people.manager)).toMatchObject({ ok: true })
    await gathering
    runId = (await strip.compute()).id
    const third = await made('More water, one point more')
    expect((await found(third)).revision).toBe('P03')
    expect((await found(second)).status).toBe('withdrawn')
  })

  it('takes the place of the one issued before', async () => {
    const open = (await listPackages(fresh.database, project.id)).find((line) => line.revision === 'P03')
    const third = open?.id ?? 0
    // A section that nobody has checked since it changed holds the checker back.
    expect(await sign(third, 'originator')).toMatchObject({ ok: true })
    expect(await sign(third, 'checker')).toMatchObject({
      ok: false,
      message: expect.stringContaining('Check these sections first'),
    })
    await checkEverything()
    expect(await sign(third, 'checker')).toMatchObject({ ok: true })
    expect(await sign(third, 'approver')).toMatchObject({ ok: true })
    await drawn(third)
    const before = await packagePdf(fresh.database, project.id, first)
    await issuePackage(fresh.database, project, third, people.manager)
    await drawn(third)
    const lines = await listPackages(fresh.database, project.id)
    expect(lines.map(({ revision, status }) => [revision, status])).toEqual([
      ['P03', 'issued'],
      ['P02', 'withdrawn'],
      ['P01', 'superseded'],
    ])
    const after = await packagePdf(fresh.database, project.id, first)
    expect(after?.bytes.equals(before?.bytes ?? Buffer.alloc(0))).toBe(true)
    const run = await findRun(fresh.database, project.id, runId)
    expect((await issuedContent(fresh.database, project.id))?.run.result).toEqual(run?.result)
  })
})

it('All three sign in a row, and the last drawing is the one that is kept', {
  timeout: 240_000,
}, async () => {
  await pump(180)
  const packageId = await made('Yet more water')
  await signedByAll(packageId)
  const { file_id, job_id, status } = await found(packageId)
  expect(status).toBe('approved')
  const [file] = await fresh.database('files').where({ id: file_id })
  expect(file.name).toBe('C-P-1 P04 approved.pdf')
  // Drawings begun before it do not come back over it.
  const jobs = await fresh.database('jobs').where({ kind: 'draw' }).orderBy('id', 'desc')
  expect(jobs[0].id).toBe(job_id)
  for (const job of jobs) await jobEnded(job.id)
  expect((await found(packageId)).file_id).toBe(file_id)
})

describe('A package whose run gives a warning that somebody has to accept', { timeout: 240_000 }, () => {
  const reason = 'The section of sheet 12 gives 3 % under the toe; the heads inside are on the safe side.'
  let packageId = 0
  let text = ''
  const wall = {
    name: 'Cut-off',
    line: [
      [800, 0],
      [800, 600],
    ],
    thickness: { value: 0.8, unit: 'm' },
    k: { value: 0.01, unit: 'm/d' },
    toe: { value: -7, unit: 'm' },
  }

  it('is drawn, and says that nobody has accepted it', async () => {
    for (const line of await listPackages(fresh.database, project.id)) {
      if (line.status === 'approved') await withdrawPackage(fresh.database, project, line.id, people.manager)
    }
    await strip.save([add('wall', wall)])
    runId = (await strip.compute()).id
    packageId = await made('With the wall')
    const waiting = await warningsToAccept(fresh.database, project.id, await found(packageId))
    expect(waiting).toEqual([
      { runId, runNumber: expect.any(Number), text: expect.stringContaining('"Cut-off"') },
    ])
    text = waiting[0]?.text ?? ''
    await drawn(packageId)
    const pdf = await packagePdf(fresh.database, project.id, packageId)
    expect(execFileSync('pdftotext', ['-', '-'], { input: pdf?.bytes, encoding: 'utf8' })).toContain(
      'by nobody yet: not for issue',
    )
  })

  it('is signed by nobody, not even by its originator', async () => {
    expect(await sign(packageId, 'originator')).toEqual({
      ok: false,
      message: expect.stringContaining(
        'a warning that nobody has accepted yet, in section 5: The wall "Cut-off"',
      ),
    })
    expect((await found(packageId)).status).toBe('draft')
  })

  it('is signed once it is accepted and gathered with who accepted it, when and why', async () => {
    await acceptWarnings(fresh.database, {
      projectId: project.id,
      runId,
      userId: people.originator,
      warnings: [text],
      reason,
    })
    // What was gathered before does not print the acceptance.
    expect(await sign(packageId, 'originator')).toMatchObject({ ok: false })
    await gatherAgain(fresh.database, project, packageId, people.originator)
    await signedByAll(packageId)
    const pdf = await packagePdf(fresh.database, project.id, packageId)
    const words = execFileSync('pdftotext', ['-raw', '-', '-'], { input: pdf?.bytes, encoding: 'utf8' })
    expect(words.replace(/\s+/g, ' ')).toMatch(
      new RegExp(`accepted by O\\. Birch on \\d+ \\w+ \\d{4}: ${reason}`),
    )
  })

  it('is not issued if its content holds a warning without its acceptance', async () => {
    const { gathered } = await found(packageId)
    const without = JSON.parse(gathered ?? '')
    without.run.acceptances = []
    await fresh
      .database('packages')
      .where({ id: packageId })
      .update({ gathered: JSON.stringify(without) })
    expect(await issuePackage(fresh.database, project, packageId, people.manager)).toEqual({
      ok: false,
      message:
        'A warning was accepted after this package was gathered: gather it again, so that it is printed.',
    })
    await fresh.database('packages').where({ id: packageId }).update({ gathered })
    expect(await issuePackage(fresh.database, project, packageId, people.manager)).toMatchObject({ ok: true })
    await drawn(packageId)
    expect((await found(packageId)).status).toBe('issued')
  })

  it('asks again for a new run of the same input', async () => {
    runId = (await strip.compute()).id
    packageId = await made('Computed once more')
    expect(await sign(packageId, 'originator')).toMatchObject({ ok: false })
    await withdrawPackage(fresh.database, project, packageId, people.manager)
  })

  it('asks for the warnings of the run that it is compared with as well', async () => {
    const before = runId
    await acceptWarnings(fresh.database, {
      projectId: project.id,
      runId,
      userId: people.originator,
      warnings: [text],
      reason,
    })
    runId = (await strip.compute()).id
    const outcome = await makePackage(
      fresh.database,
      project,
      { ...order('Compared'), runId: before, againstRunId: runId },
      people.manager,
    )
    packageId = outcome.ok ? outcome.packageId : 0
    expect(await warningsToAccept(fresh.database, project.id, await found(packageId))).toMatchObject([
      { runId },
    ])
    expect(await sign(packageId, 'originator')).toMatchObject({ ok: false })
    await withdrawPackage(fresh.database, project, packageId, people.manager)
  })
})

it('A run that says it is not to be used as it is makes no package, converged or not', async () => {
  const run = await findRun(fresh.database, project.id, runId)
  const warnings = [
    { code: 'outflow-from-dry-cells', severity: 'serious', text: 'More than the ground can yield.' },
  ]
  const result = JSON.stringify({ ...run?.result, warnings })
  await fresh.database('runs').where({ id: runId }).update({ result })
  expect(await makePackage(fresh.database, project, order(), people.manager)).toEqual({
    ok: false,
    message: expect.stringContaining(
      'not to be used as it is, so it cannot be packaged: More than the ground',
    ),
  })
})
