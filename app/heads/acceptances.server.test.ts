import { randomUUID } from 'node:crypto'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { checkSection, sectionStatus } from '~/book/sections.server'
import { recentHistory } from '~/projects/history.server'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson } from '../../test/people'
import { add, makeStrip, type Strip, stripWell } from '../../test/strip'
import { acceptanceSchema, notAccepted } from './acceptance'
import { acceptancesOf, acceptWarnings } from './acceptances.server'
import type { Run } from './runs.server'

let fresh: FreshDatabase
let strip: Strip
let run: Run
let userId: number
const reason = 'The heads inside the wall are wanted to 0.5 m only; the section of sheet 12 gives 0.1 m.'

beforeAll(async () => {
  fresh = await freshDatabase()
  userId = await makePerson(fresh.database, { name: 'O. Birch' })
  strip = await makeStrip(fresh.database, { number: 'A-1', originator: userId })
  const m = (value: number) => ({ value, unit: 'm' })
  const wall = { thickness: m(0.8), k: { value: 0.01, unit: 'm/d' } }
  const across = (x: number) => [
    [x, 0],
    [x, 600],
  ]
  await strip.save([
    add('wall', { ...wall, name: 'Hangs', line: across(800), toe: m(-7) }),
    add('wall', { ...wall, name: 'Reaches', line: across(200), toe: m(-10.5) }),
    {
      op: 'edit',
      kind: 'well',
      id: strip.ids.well,
      version: 1,
      body: { ...stripWell(50), radius: m(0.1), screenTop: m(-1), screenBottom: m(-3) },
    },
  ])
  run = await strip.compute()
}, 120_000)
afterAll(() => fresh.close())

const accept = (warnings: string[], more: Partial<Parameters<typeof acceptWarnings>[1]> = {}) =>
  acceptWarnings(fresh.database, {
    projectId: strip.project.id,
    runId: run.id,
    userId,
    warnings,
    reason,
    ...more,
  })
const textOf = (code: string) => run.result?.warnings.find((warning) => warning.code === code)?.text ?? ''

describe('A warning that somebody has to accept', () => {
  it('comes of the toe of a wall and of the screen of a well, as the sheets of section 3 have them', () => {
    expect(run.model.walls?.map(({ toe }) => toe)).toEqual([-7, -10.5])
    expect(run.model.wells?.[0]?.screen).toEqual({ top: -1, bottom: -3 })
    expect(notAccepted(run.result?.warnings ?? [], []).map(({ code }) => code)).toEqual([
      'hanging-wall',
      'part-screen',
    ])
  })

  it('is accepted with a reason: who, when and why are kept, and section 5 counts as changed since its check', async () => {
    const { digest } = await sectionStatus(fresh.database, strip.project.id, 'heads')
    await checkSection(fresh.database, strip.project.id, 'heads', userId, digest)
    expect(await accept([textOf('hanging-wall')])).toEqual({ ok: true, accepted: 1 })
    const [acceptance, ...others] = await acceptancesOf(fresh.database, strip.project.id, run.id)
    expect(others).toEqual([])
    expect(acceptance).toMatchObject({
      code: 'hanging-wall',
      warning: textOf('hanging-wall'),
      by: 'O. Birch',
      reason,
    })
    expect(Date.parse(acceptance?.at ?? '')).toBeGreaterThan(Date.now() - 60_000)
    expect((await sectionStatus(fresh.database, strip.project.id, 'heads')).state).toBe('changed since check')
    expect((await recentHistory(fresh.database, strip.project.id))[0]).toMatchObject({
      action: 'accepted warning',
      person: 'O. Birch',
      reason,
    })
  })

  it('is accepted once: whoever comes second is told who was first', async () => {
    expect(await accept([textOf('part-screen'), textOf('hanging-wall')])).toEqual({
      ok: false,
      message: expect.stringContaining('O. Birch has accepted this already'),
    })
    const answers = await Promise.all([1, 2].map(() => accept([textOf('part-screen')])))
    expect(answers.filter((answer) => answer.ok)).toHaveLength(1)
    expect(await acceptancesOf(fresh.database, strip.project.id, run.id)).toHaveLength(2)
    expect(
      notAccepted(run.result?.warnings ?? [], await acceptancesOf(fresh.database, strip.project.id, run.id)),
    ).toEqual([])
  })

  it('is not another warning, a text that the run does not say, or one of another project', async () => {
    const note = { code: 'n', severity: 'note', text: 'For information only.' }
    const result = { ...run.result, warnings: [...(run.result?.warnings ?? []), note] }
    await fresh
      .database('runs')
      .where({ id: run.id })
      .update({ result: JSON.stringify(result) })
    for (const [warnings, more, message] of [
      [['For information only.'], {}, 'not one to be accepted'],
      [['All is well.'], {}, 'does not give this warning'],
      [[], {}, 'Tick the warnings'],
      [[textOf('hanging-wall')], { projectId: strip.project.id + 1 }, 'no such run'],
    ] as const) {
      expect(await accept([...warnings], more)).toEqual({
        ok: false,
        message: expect.stringContaining(message),
      })
    }
    expect(await acceptancesOf(fresh.database, strip.project.id + 1, run.id)).toEqual([])
  })

  it('is open again in a new run of the same input', async () => {
    const again = await strip.compute()
    expect(again.inputSha256).toBe(run.inputSha256)
    expect(await acceptancesOf(fresh.database, strip.project.id, again.id)).toEqual([])
  })
})

describe('The form', () => {
  const parse = (given: object) =>
    acceptanceSchema.safeParse({ runId: '7', warnings: ['It hangs.'], reason, ...given })

  it('takes one warning or several, with a sentence', () => {
    expect(parse({}).data).toEqual({ runId: 7, warnings: ['It hangs.'], reason })
    expect(parse({ warnings: ['a', 'b'] }).data?.warnings).toEqual(['a', 'b'])
  })

  it('refuses a reason that says nothing', () => {
    for (const empty of [
      undefined,
      '',
      'ok',
      '                        .',
      'accepted-accepted-accepted',
      randomUUID(),
    ]) {
      expect(parse({ reason: empty }).success).toBe(false)
    }
    expect(parse({ warnings: [] }).success).toBe(false)
  })
})
