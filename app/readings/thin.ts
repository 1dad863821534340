/** A head at an instant: milliseconds since 1970, and metres. */
export type SeriesPoint = [at: number, head: number]

/**
 * At most `most` points of a series in order of time that still reach every peak and trough: of each equal span of time the
 * first, lowest, highest and last are kept.
 */
export function thin(points: readonly SeriesPoint[], most: number): SeriesPoint[] {
  const first = points[0]
  const last = points.at(-1)
  if (points.length <= most || !first || !last) return [...points]
  const spans = Math.max(1, Math.floor(most / 4))
  const width = (last[0] - first[0]) / spans || 1
  const kept: SeriesPoint[] = []
  let start = 0
  for (let span = 0; span < spans && start < points.length; span++) {
    const end = span === spans - 1 ? Number.POSITIVE_INFINITY : first[0] + (span + 1) * width
    let stop = start
    let low = start
    let high = start
    while (stop < points.length && (points[stop] as SeriesPoint)[0] < end) {
      if ((points[stop] as SeriesPoint)[1] < (points[low] as SeriesPoint)[1]) low = stop
      if ((points[stop] as SeriesPoint)[1] > (points[high] as SeriesPoint)[1]) high = stop
      stop++
    }
    if (stop === start) continue
    const wanted = [...new Set([start, low, high, stop - 1])].sort((a, b) => a - b)
    kept.push(...wanted.map((index) => points[index] as SeriesPoint))
    start = stop
  }
  return kept
}

/**
 * Where a line through the points must break: the instants after which more than `times` the usual spacing passes with no
 * reading. The usual spacing is the median one.
 */
export function gaps(points: readonly SeriesPoint[], times = 6): number[] {
  if (points.length < 4) return []
  const spacings = points.slice(1).map((point, index) => point[0] - (points[index] as SeriesPoint)[0])
  const median = [...spacings].sort((a, b) => a - b)[Math.floor(spacings.length / 2)] ?? 0
  return spacings.flatMap((spacing, index) =>
    spacing > median * times && spacing > 0 ? [(points[index] as SeriesPoint)[0]] : [],
  )
}
