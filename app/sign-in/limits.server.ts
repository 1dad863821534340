import { createHash } from 'node:crypto'
import { RateLimiterMySQL, RateLimiterRes } from 'rate-limiter-flexible'
import { database } from '~database/connection.server'

/** How often something may be done within so many seconds, for each key (an e-mail or a client address). */
const limits = {
  'code for e-mail': { points: 10, duration: 900 },
  'code for address': { points: 60, duration: 900 },
  'try for e-mail': { points: 20, duration: 900 },
  'try for address': { points: 100, duration: 900 },
  'invitation to e-mail': { points: 5, duration: 3600 },
} as const
export type LimitName = keyof typeof limits

let limiters: { schema: string; byName: Map<LimitName, RateLimiterMySQL> } | undefined

function limiter(name: LimitName): RateLimiterMySQL {
  const db = database()
  const schema = db.client.database() as string
  if (limiters?.schema !== schema) limiters = { schema, byName: new Map() }
  const made = limiters.byName.get(name)
  if (made) return made
  const fresh = new RateLimiterMySQL({
    ...limits[name],
    storeClient: db,
    storeType: 'knex',
    dbName: schema,
    tableName: 'rate_limits',
    tableCreated: true,
    keyPrefix: name,
  })
  limiters.byName.set(name, fresh)
  return fresh
}

// Hashed: a key column holds 255 characters, and the counters need not say whose they are.
function shortKey(key: string): string {
  return createHash('sha256').update(key).digest('hex')
}

/**
 * Counts one use. Returns undefined while the limit allows it, else the seconds until it will again.
 * Counted before the deed, so that many requests at once cannot pass together.
 */
export async function spend(name: LimitName, key: string): Promise<number | undefined> {
  try {
    await limiter(name).consume(shortKey(key))
    return undefined
  } catch (refusal) {
    if (refusal instanceof RateLimiterRes) return Math.max(1, Math.ceil(refusal.msBeforeNext / 1000))
    throw refusal
  }
}

/** Gives one use back: what was tried turned out to be right. */
export async function giveBack(name: LimitName, key: string): Promise<void> {
  await limiter(name).reward(shortKey(key))
}
