import { afterAll, expect, test } from 'vitest'
import { freshDatabase } from './database.ts'

const opened: { close: () => Promise<void> }[] = []
afterAll(async () => {
  for (const { close } of opened) await close()
})

test('Each test file gets a schema of its own, with every migration applied and its foreign keys in force', async () => {
  const first = await freshDatabase()
  const [keys] = await first.database.raw(
    'select count(*) as count from information_schema.referential_constraints where constraint_schema = ?',
    [first.name],
  )
  expect(keys[0].count).toBeGreaterThan(10)
  await first.database('users').insert({ email: 'one@example.test', name: 'One', created_at: new Date(0) })
  await expect(
    first.database('jobs').insert({ user_id: 99, kind: 'solve', state: 'queued', created_at: new Date(0) }),
  ).rejects.toThrow(/foreign key/)
  await first.close()

  const second = await freshDatabase()
  opened.push(second)
  expect(second.name).not.toBe(first.name)
  expect(await second.database('users')).toEqual([])
  const [, pending] = await second.database.migrate.list({
    directory: 'database/migrations',
    extension: 'ts',
    loadExtensions: ['.ts'],
  })
  expect(pending).toEqual([])
})
