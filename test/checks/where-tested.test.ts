import { existsSync, readdirSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { describe, expect, it } from 'vitest'
import published from './published.json'
import table from './where-tested.json'

interface Row {
  id: string
  title: string
  testedIn?: string[]
  notYet?: string
}

const root = join(import.meta.dirname, '../..')
const rows: Row[] = table

/** Every mention of an id, and of no longer one that starts with it. */
function names(file: string, id: string): boolean {
  return new RegExp(`['" ]${id}['":. ]`).test(readFileSync(join(root, file), 'utf8'))
}

describe('the table of published checks', () => {
  it('lists all 86, each once, with where it is tested or why not yet', () => {
    expect(rows).toHaveLength(86)
    expect(new Set(rows.map((row) => row.id)).size).toBe(86)
    for (const row of rows) {
      expect(row.title.length, row.id).toBeGreaterThan(0)
      expect(row.testedIn === undefined, row.id).toBe(row.notYet !== undefined)
      if (row.notYet !== undefined) expect(row.notYet.length, row.id).toBeGreaterThan(20)
    }
  })

  it.each(rows.filter((row) => row.testedIn))('$id is tested where it says', ({ id, testedIn }) => {
    for (const file of testedIn as string[]) {
      expect(existsSync(join(root, file)), file).toBe(true)
      expect(names(file, id), `${file} names ${id}`).toBe(true)
    }
  })

  it('says "not yet" of none that a test here names, and holds the values of none but those tested', () => {
    const files = readdirSync(import.meta.dirname).filter((file) =>
      /^(?!where-tested).*\.test\.ts$/.test(file),
    )
    for (const { id } of rows.filter((row) => row.notYet)) {
      for (const file of files)
        expect(names(join('test/checks', file), id), `${file} names ${id}`).toBe(false)
    }
    const tested = new Set(rows.filter((row) => row.testedIn).map((row) => row.id))
    for (const { id } of published) expect(tested.has(id), id).toBe(true)
  })
})
