/** One measured size: cells a side and seconds, set-up and solve. */
export interface Cost {
  n: number
  seconds: number
}

const colours = ['#2f6f8f', '#b0503c', '#6b7f3a']

/** Cost per cell against cells, as an SVG for light and dark pages: one line a problem, logarithmic along x. */
export function costPlot(lines: { name: string; costs: Cost[] }[], caption: string): string {
  const [width, height, left, bottom, top, right] = [640, 320, 64, 56, 34, 70]
  const sizes = [...new Set(lines.flatMap(({ costs }) => costs.map(({ n }) => n)))].sort((a, b) => a - b)
  const first = Math.log2(sizes[0] as number)
  const last = Math.log2(sizes[sizes.length - 1] as number)
  const perCell = ({ n, seconds }: Cost) => (1e9 * seconds) / n ** 2
  const most = Math.max(...lines.flatMap(({ costs }) => costs.map(perCell)))
  const step = 10 ** Math.floor(Math.log10(most))
  const mark = most / step > 5 ? 2 * step : most / step > 2 ? step : step / 2
  const high = mark * Math.ceil(most / mark)
  const x = (n: number) =>
    left + ((Math.log2(n) - first) / Math.max(1, last - first)) * (width - left - right)
  const y = (value: number) => height - bottom - (value / high) * (height - bottom - top)
  const parts: string[] = []
  for (let value = 0; value <= high + 1e-9; value += mark) {
    parts.push(
      `<line x1="${left}" x2="${width - right}" y1="${y(value).toFixed(1)}" y2="${y(value).toFixed(1)}" stroke="#8884" />`,
      `<text x="${left - 8}" y="${(y(value) + 4).toFixed(1)}" text-anchor="end">${Math.round(value)}</text>`,
    )
  }
  for (const n of sizes) {
    parts.push(`<text x="${x(n).toFixed(1)}" y="${height - bottom + 18}" text-anchor="middle">${n}²</text>`)
  }
  const names = apart(
    lines.map(({ name, costs }) => ({ name, at: y(perCell(costs[costs.length - 1] as Cost)) + 4 })),
  )
  lines.forEach(({ name, costs }, k) => {
    const colour = colours[k % colours.length]
    const points = costs.map((cost) => `${x(cost.n).toFixed(1)},${y(perCell(cost)).toFixed(1)}`)
    parts.push(
      `<polyline points="${points.join(' ')}" fill="none" stroke="${colour}" stroke-width="2" />`,
      ...points.map((point) => {
        const [cx, cy] = point.split(',')
        return `<circle cx="${cx}" cy="${cy}" r="3" fill="${colour}" />`
      }),
      `<text x="${width - right + 8}" y="${names.get(name)?.toFixed(1)}" fill="${colour}">${name}</text>`,
    )
  })
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ${width} ${height}" font-family="sans-serif" font-size="12" fill="#777">
<title>Cost per cell of a linear solve against the number of cells</title>
<text x="${left - 48}" y="20">nanoseconds a cell, set-up and solve</text>
${parts.join('\n')}
<text x="${left}" y="${height - 14}">cells; ${caption}</text>
</svg>
`
}

/** Places for names along a side, from the top down, at least a line apart. */
function apart(labels: { name: string; at: number }[]): Map<string, number> {
  let last = Number.NEGATIVE_INFINITY
  const places = new Map<string, number>()
  for (const { name, at } of labels.toSorted((a, b) => a.at - b.at)) {
    last = Math.max(at, last + 14)
    places.set(name, last)
  }
  return places
}
