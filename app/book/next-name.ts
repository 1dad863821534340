/** The next name of a numbered series: W9 after W8, "P10" after "P9"; the first of a series where there is none. */
export function nextName(names: readonly string[], prefix: string): string {
  const numbers = names.map((name) =>
    name.startsWith(prefix) && /^\d+$/.test(name.slice(prefix.length))
      ? Number(name.slice(prefix.length))
      : 0,
  )
  return `${prefix}${Math.max(0, ...numbers) + 1}`
}
