/**
 * Draws the plan image of the demo site (database/seeds/site-plan.png) from database/seeds/site-plan.ts, with headless
 * Chromium. Run after changing the plan: node --import tsx scripts/make-demo-plan.ts
 */
import { readFile, writeFile } from 'node:fs/promises'
import { createRequire } from 'node:module'
import { chromium } from 'playwright-core'
import {
  atGrid,
  basinA,
  basinB,
  buildings,
  cutOffWall,
  dig,
  type PlanVertex,
  planExtent,
  planPicture,
  planPixel,
  railway,
  river,
  riverWidth,
  spotLevels,
  streets,
  surveyStations,
  worksBoundary,
  worksYard,
} from '../database/seeds/site-plan.ts'

const scale = 1.25

function spot([x, y]: PlanVertex): string {
  const { column, row } = planPixel([x, y])
  return `${column.toFixed(2)} ${row.toFixed(2)}`
}

function straight(line: PlanVertex[], closed = false): string {
  return `M${line.map(spot).join('L')}${closed ? 'Z' : ''}`
}

/** A smooth line through the vertices (Catmull-Rom as cubic curves). */
function curved(line: PlanVertex[]): string {
  const at = (i: number) => line[Math.max(0, Math.min(line.length - 1, i))] as PlanVertex
  let path = `M${spot(at(0))}`
  for (let i = 0; i < line.length - 1; i++) {
    const [before, from, to, after] = [at(i - 1), at(i), at(i + 1), at(i + 2)]
    const one: PlanVertex = [from[0] + (to[0] - before[0]) / 6, from[1] + (to[1] - before[1]) / 6]
    const two: PlanVertex = [to[0] - (after[0] - from[0]) / 6, to[1] - (after[1] - from[1]) / 6]
    path += `C${spot(one)} ${spot(two)} ${spot(to)}`
  }
  return path
}

function moved(line: PlanVertex[], dy: number): PlanVertex[] {
  return line.map(([x, y]) => [x, y + dy])
}

function label(at: PlanVertex, words: string, options = ''): string {
  const { column, row } = planPixel(at)
  return `<text x="${column}" y="${row}" text-anchor="middle" ${options}>${words}</text>`
}

/** A quiet, repeatable scatter, so that the drawing comes out the same each time. */
function scatter(seed: number): () => number {
  let state = seed
  return () => {
    state = (state * 1_103_515_245 + 12_345) % 2_147_483_648
    return state / 2_147_483_648
  }
}

function trees(): string {
  const next = scatter(7)
  const rows: [PlanVertex, PlanVertex, number][] = [
    [[20, 118], [380, 128], 16],
    [[20, 14], [1180, 20], 52],
    [[90, 506], [345, 516], 11],
    [[90, 602], [345, 610], 10],
    [[420, 446], [890, 450], 18],
    [[1140, 420], [1170, 580], 8],
    [[950, 116], [1010, 116], 4],
  ]
  return rows
    .flatMap(([from, to, count]) =>
      Array.from({ length: count }, (_, i) => {
        const t = count > 1 ? i / (count - 1) : 0
        const x = from[0] + (to[0] - from[0]) * t + (next() - 0.5) * 14
        const y = from[1] + (to[1] - from[1]) * t + (next() - 0.5) * 9
        const { column, row } = planPixel([x, y])
        return `<circle cx="${column.toFixed(1)}" cy="${row.toFixed(1)}" r="${(3.4 + next() * 3).toFixed(1)}"/>`
      }),
    )
    .join('')
}

function basin(ring: PlanVertex[]): string {
  const cx = ring.reduce((sum, [x]) => sum + x, 0) / ring.length
  const cy = ring.reduce((sum, [, y]) => sum + y, 0) / ring.length
  const inner = ring.map(([x, y]): PlanVertex => [cx + (x - cx) * 0.88, cy + (y - cy) * 0.8])
  const slopes = ring
    .flatMap((from, i) => {
      const to = ring[(i + 1) % ring.length] as PlanVertex
      const length = Math.hypot(to[0] - from[0], to[1] - from[1])
      return Array.from({ length: Math.floor(length / 5) }, (_, j) => {
        const t = (j + 0.5) / Math.floor(length / 5)
        const x = from[0] + (to[0] - from[0]) * t
        const y = from[1] + (to[1] - from[1]) * t
        const reach = j % 2 === 0 ? 0.1 : 0.05
        return `M${spot([x, y])}L${spot([x + (cx - x) * reach, y + (cy - y) * reach * 1.8])}`
      })
    })
    .join('')
  return `<path d="${straight(ring, true)}" fill="#eceae4" stroke="#8d918f"/>
    <path d="${straight(inner, true)}" fill="#e0e5e6" stroke="#b3b9b9" stroke-width="0.8"/>
    <path d="${slopes}" stroke="#a9adab" stroke-width="0.8" fill="none"/>`
}

function railwaySleepers(): string {
  let path = ''
  for (let i = 0; i < railway.length - 1; i++) {
    const [from, to] = [railway[i] as PlanVertex, railway[i + 1] as PlanVertex]
    for (let j = 0; j < 80; j++) {
      const x = from[0] + ((to[0] - from[0]) * j) / 80
      const y = from[1] + ((to[1] - from[1]) * j) / 80
      path += `M${spot([x, y - 4])}L${spot([x, y + 4])}`
    }
  }
  return path
}

function gridCrosses(): string {
  let path = ''
  for (let x = planExtent.xMin + 100; x < planExtent.xMax; x += 100) {
    for (let y = planExtent.yMin + 100; y < planExtent.yMax; y += 100) {
      const { column, row } = planPixel([x, y])
      path += `M${column - 4} ${row}h8M${column} ${row - 4}v8`
    }
  }
  return `<path d="${path}" stroke="#9a9d9b" stroke-width="0.7"/>`
}

/** Eastings and northings along the frame. */
function gridNumbers(): string {
  let numbers = ''
  for (let x = planExtent.xMin; x <= planExtent.xMax; x += 200) {
    const { column } = planPixel([x, 0])
    numbers += `<text x="${column}" y="41" text-anchor="middle" class="grid">${atGrid([x, 0])[0]}</text>`
    numbers += `<text x="${column}" y="1003" text-anchor="middle" class="grid">${atGrid([x, 0])[0]}</text>`
  }
  for (let y = planExtent.yMin + 200; y <= planExtent.yMax; y += 200) {
    const { row } = planPixel([0, y])
    for (const column of [42, 1566]) {
      numbers += `<text transform="translate(${column} ${row}) rotate(-90)" text-anchor="middle" class="grid">${atGrid([0, y])[1]}</text>`
    }
  }
  return numbers
}

function station(name: string, at: PlanVertex): string {
  const { column, row } = planPixel(at)
  const [easting, northing] = atGrid(at)
  const side = column > planPicture.width / 2 ? -1 : 1
  return `<g stroke="#4d5150" fill="none"><circle cx="${column}" cy="${row}" r="7" fill="#fbfaf7"/>
    <path d="M${column - 12} ${row}h24M${column} ${row - 12}v24"/></g>
    <text x="${column + side * 16}" y="${row + 17}" text-anchor="${side > 0 ? 'start' : 'end'}" class="mark halo"><tspan font-weight="600">${name}</tspan>
    ${easting} E ${northing} N</text>`
}

function streetName(name: string, at: PlanVertex, degrees: number): string {
  const { column, row } = planPixel(at)
  return `<text transform="translate(${column} ${row}) rotate(${degrees})" text-anchor="middle" dy="4.5" class="street halo">${name}</text>`
}

function plan(font: string): string {
  const { width, height } = planPicture
  const frame = planPixel([planExtent.xMin, planExtent.yMax])
  const frameWidth = (planExtent.xMax - planExtent.xMin) * scale
  const frameHeight = (planExtent.yMax - planExtent.yMin) * scale
  const end = frame.row + frameHeight
  return `<!doctype html><meta charset="utf-8"><style>
    @font-face { font-family: Plan; src: url(data:font/ttf;base64,${font}); font-weight: 200 900 }
    body { margin: 0 } svg { display: block; font-family: Plan; font-size: 13px }
    text { fill: #5c605f } .grid { font-size: 11.5px; fill: #7a7e7c } .mark { font-size: 13px; fill: #4d5150 }
    .street { font-size: 13.5px; fill: #6d716f; letter-spacing: 0.04em }
    .halo { paint-order: stroke; stroke: #fbfaf7; stroke-width: 3px; stroke-linejoin: round }
    .level { font-size: 11.5px; fill: #7a7e7c }
  </style>
  <svg xmlns="http://www.w3.org/2000/svg" width="${width}" height="${height}" viewBox="0 0 ${width} ${height}">
    <rect width="${width}" height="${height}" fill="#fdfcf9"/>
    <clipPath id="frame"><rect x="${frame.column}" y="${frame.row}" width="${frameWidth}" height="${frameHeight}"/></clipPath>
    <pattern id="yard" width="9" height="9" patternUnits="userSpaceOnUse"><circle cx="2" cy="2" r="0.8" fill="#b3b5b1"/><circle cx="6.5" cy="6.5" r="0.8" fill="#b3b5b1"/></pattern>
    <g clip-path="url(#frame)" stroke-linejoin="round">
      <rect width="${width}" height="${height}" fill="#f6f5f0"/>
      <path d="${curved(moved(river, -40))}L${spot([1200, 0])}L${spot([0, 0])}Z" fill="#eff0e9"/>
      <g fill="none">
        <path d="${curved(river)}" stroke="#8d918f" stroke-width="${riverWidth * scale + 3}"/>
        <path d="${curved(river)}" stroke="#dbe2e4" stroke-width="${riverWidth * scale}"/>
        <path d="${curved(moved(river, 9))}" stroke="#c4ced1" stroke-dasharray="90 34"/>
        <path d="${curved(moved(river, -7))}" stroke="#c4ced1" stroke-dasharray="60 50" stroke-dashoffset="30"/>
        <path d="${curved(moved(river, -40))}" stroke="#a9ada6" stroke-dasharray="2 5" stroke-width="5"/>
        <path d="${curved(moved(river, -40))}" stroke="#a9ada6"/>
      </g>
      <g fill="none" stroke-linecap="round">
        ${streets.map((s) => `<path d="${curved(s.line)}" stroke="#a4a8a5" stroke-width="${s.width * scale + 2}"/>`).join('')}
        ${streets.map((s) => `<path d="${curved(s.line)}" stroke="#fdfcf9" stroke-width="${s.width * scale}"/>`).join('')}
      </g>
      <path d="M${spot([925, 148])}L${spot([929, 34])}M${spot([934, 148])}L${spot([938, 34])}" stroke="#8d918f" stroke-width="1.2" fill="none"/>
      <path d="M${spot([929.5, 146])}L${spot([933.5, 34])}" stroke="#fdfcf9" stroke-width="${8.6 * scale}" fill="none"/>
      <path d="${curved(railway)}" stroke="#8d918f" stroke-width="1.1" fill="none"/>
      <path d="${railwaySleepers()}" stroke="#9a9d9b" stroke-width="1" fill="none"/>
      <path d="${curved(moved(railway, 2.2))}M${curved(moved(railway, -2.2)).slice(1)}" stroke="#7f8381" stroke-width="1.2" fill="none"/>
      <path d="${curved(moved(railway, -12))}" stroke="#a9ada6" stroke-dasharray="2 4" fill="none"/>
      ${basin(basinA)}${basin(basinB)}
      <g fill="#e4e7dd" stroke="#bcc1b5" stroke-width="0.8">${trees()}</g>
      <g fill="#dddcd6" stroke="#8d908e" stroke-width="1">
        ${buildings.map((building) => `<path d="${straight(building.outline, true)}"/>`).join('')}
      </g>
      <path d="${straight(worksBoundary, true)}" fill="#faf7ee" stroke="#7a7e7c" stroke-width="1.4" stroke-dasharray="12 3 2 3"/>
      <path d="${straight(worksYard, true)}" fill="url(#yard)" stroke="#a4a8a5" stroke-dasharray="5 3"/>
      <g fill="#e6e4dc" stroke="#8d908e">
        ${[0, 1, 2]
          .map(
            (i) =>
              `<path d="${straight(
                [
                  [744 + i * 15, 296],
                  [756 + i * 15, 296],
                  [756 + i * 15, 314],
                  [744 + i * 15, 314],
                ],
                true,
              )}"/>`,
          )
          .join('')}
      </g>
      <path d="M${spot([612, 300])}L${spot([612, 204])}M${spot([626, 300])}L${spot([626, 204])}" stroke="#a4a8a5" stroke-dasharray="6 4" fill="none"/>
      <path d="${straight(dig, true)}" fill="#efece2" stroke="#5c605f" stroke-width="1.6" stroke-dasharray="7 4"/>
      <path d="M${spot([555, 300])}L${spot([645, 360])}M${spot([555, 360])}L${spot([645, 300])}" stroke="#c6c5bd" stroke-width="0.8"/>
      <path d="${straight(cutOffWall)}" fill="none" stroke="#8d918f" stroke-width="2" stroke-dasharray="3 3"/>
      ${gridCrosses()}
      <g>
        ${streetName('Salters Road', [760, 627], 0.6)}
        ${streetName('Quay Street', [399, 400], -88)}
        ${streetName('Chapel Row', [500, 467], 0.3)}
        ${streetName('Coopers Lane', [912, 392], -265.5)}
        ${streetName('The Strand', [110, 141], -4.5)}
        ${label([290, 92], 'River Tarrow', 'class="street" font-style="italic" style="font-size:16px"')}
        ${label([1110, 72], 'flow →', 'class="street" font-style="italic"')}
        ${label([640, 22], 'Meadow, flood bank', 'class="street halo"')}
        ${label([560, 726], 'Railway', 'class="street halo"')}
        ${label([156, 551], 'Basin A')}${label([286, 559], 'Basin B')}
        ${label([600, 331], 'Shaft excavation', 'class="halo" style="font-size:14px;fill:#4d5150"')}
        ${label([600, 377], 'line of cut-off wall', 'class="level halo"')}
        ${label([740, 262], 'Works yard', 'class="halo"')}
        ${label([619, 240], 'ramp', 'class="level halo"')}
        ${label([494, 424], 'Site hoarding', 'class="level"')}
        ${buildings
          .map(({ name, nameAt, nameTurn = 0 }) => {
            if (!name || !nameAt) return ''
            const { column, row } = planPixel(nameAt)
            return `<text transform="translate(${column} ${row}) rotate(${nameTurn})" dy="4" text-anchor="middle">${name}</text>`
          })
          .join('')}
        ${spotLevels
          .map(({ at, level }) => {
            const { column, row } = planPixel(at)
            return `<path d="M${column - 3} ${row - 3}l6 6M${column + 3} ${row - 3}l-6 6" stroke="#8d918f"/><text x="${column + 6}" y="${row + 4}" class="level">${level.toFixed(1)}</text>`
          })
          .join('')}
        ${Object.entries(surveyStations)
          .map(([name, at]) => station(name, at))
          .join('')}
      </g>
    </g>
    <rect x="${frame.column}" y="${frame.row}" width="${frameWidth}" height="${frameHeight}" fill="none" stroke="#4d5150" stroke-width="1.6"/>
    ${gridNumbers()}
    <g transform="translate(50 ${end + 34})">
      <text y="20" style="font-size:24px;fill:#3c403f" font-weight="600">Site plan, drawing for demo</text>
      <text y="46">Invented site. Grid in metres, crosses every 100 m. Levels in metres above datum. ST1 and ST2 are survey stations.</text>
    </g>
    <g transform="translate(1180 ${end + 48})" stroke="#4d5150" fill="#4d5150">
      <path d="M0 0h250" fill="none"/><path d="M0 -5v10M62.5 -5v10M125 -5v10M250 -5v10"/><rect width="62.5" y="-3" height="6"/><rect x="125" width="125" y="-3" height="6"/>
      <g stroke="none" text-anchor="middle" class="grid"><text y="20">0</text><text x="62.5" y="20">50</text><text x="125" y="20">100</text><text x="250" y="20">200 m</text></g>
    </g>
    <g transform="translate(1510 ${end + 50})"><path d="M0 -26L10 22L0 13L-10 22Z" fill="#4d5150"/><text y="38" text-anchor="middle" style="fill:#3c403f" font-weight="600">N</text></g>
  </svg>`
}

const require = createRequire(import.meta.url)
const font = await readFile(require.resolve('source-sans/TTF/SourceSans3-Regular.ttf'))
const browser = await chromium.launch({
  executablePath: process.env.LAVANT_CHROMIUM ?? '/usr/bin/chromium',
  args: ['--no-sandbox', '--disable-gpu'],
})
try {
  const page = await browser.newPage({
    viewport: { width: planPicture.width, height: planPicture.height },
    deviceScaleFactor: 1,
  })
  await page.setContent(plan(font.toString('base64')))
  await page.evaluate(() => document.fonts.ready)
  const picture = await page.screenshot({ type: 'png' })
  const target = new URL(`../database/seeds/${planPicture.file}`, import.meta.url)
  await writeFile(target, picture)
  process.stdout.write(`${planPicture.file}: ${picture.byteLength} bytes\n`)
} finally {
  await browser.close()
}
