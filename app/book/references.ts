/** A row that carries a source note. */
export interface Sourced {
  name: string
  source: string
  /** When the version in force was recorded, ISO 8601. */
  recordedFrom: string
}

export interface ReferenceLine {
  no: string
  text: string
  changed: boolean
}

/**
 * The sources of one sheet for the reference margin: rows with the same source share a line, "3.1 W1–W3" with its
 * text. A line is marked where one of its rows changed after the check of the section.
 */
export function referenceLines(
  no: string,
  rows: readonly Sourced[],
  checkedAt: Date | null,
): ReferenceLine[] {
  const bySource = new Map<string, Sourced[]>()
  for (const row of rows) {
    if (row.source === '') continue
    bySource.set(row.source, [...(bySource.get(row.source) ?? []), row])
  }
  return [...bySource].map(([source, group]) => ({
    no: `${no} ${joinNames(group.map((row) => row.name))}`,
    text: source,
    changed: checkedAt !== null && group.some((row) => row.recordedFrom > checkedAt.toISOString()),
  }))
}

/** W1, W2, W3, W7 as "W1–W3, W7"; names without a number at their end are listed as they are. */
export function joinNames(names: readonly string[]): string {
  const parts: string[] = []
  let start = 0
  for (let i = 1; i <= names.length; i++) {
    const [before, here] = [names[i - 1] as string, names[i]]
    if (here !== undefined && follows(before, here)) continue
    const run = names.slice(start, i)
    parts.push(run.length > 2 ? `${run[0]}–${run.at(-1)}` : run.join(', '))
    start = i
  }
  return parts.join(', ')
}

function follows(before: string, here: string): boolean {
  const [a, b] = [before.match(/^(.*?)(\d+)$/), here.match(/^(.*?)(\d+)$/)]
  return a !== null && b !== null && a[1] === b[1] && Number(b[2]) === Number(a[2]) + 1
}
