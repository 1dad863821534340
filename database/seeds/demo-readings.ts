/**
 * A year of invented readings as files from the field: logger files every six hours, hand dips about weekly.
 * The same numbers come out every time. Heads follow a base level with a season, rain and its recession, a tide near
 * the river, the pumping from 14 September 2026, and the noise of the instrument.
 */
export interface DemoHead {
  name: string
  kind: string
  /** Level of the pipe top, metres above datum, from each instant on. */
  pipeTop: { from: string; level: number }[]
  /** Head without pumping and with it, metres above datum, as computed by the runs. */
  before: number
  during: number
  /** What the model misses here, metres. */
  offset: number
  /** Part of the river's range that this instrument feels, 0 to 1. */
  tide: number
}

export interface DemoFile {
  name: string
  /** Instrument that the whole file belongs to; null when the file names it in a column. */
  instrument: string | null
  text: string
}

const hour = 3_600_000
const day = 24 * hour
export const readingsFrom = Date.UTC(2025, 10, 20)
export const readingsTo = Date.UTC(2026, 10, 28)
const pumpingFrom = Date.UTC(2026, 8, 14, 9)

/** Mulberry32: small, seeded, good enough for noise (public domain, T. Ettinger 2017). */
function randomFrom(seed: number): () => number {
  let state = seed >>> 0
  return () => {
    state = (state + 0x6d2b79f5) >>> 0
    let t = Math.imul(state ^ (state >>> 15), 1 | state)
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t
    return ((t ^ (t >>> 14)) >>> 0) / 4_294_967_296
  }
}

function gaussian(random: () => number): number {
  return Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random())
}

/** Daily rain in millimetres: wetter in winter, none from mid June to late July. */
function dailyRain(): Float64Array {
  const random = randomFrom(4107)
  const days = Math.ceil((readingsTo - readingsFrom) / day) + 1
  return Float64Array.from({ length: days }, (_, i) => {
    const date = new Date(readingsFrom + i * day)
    const month = date.getUTCMonth()
    const drySpell = (month === 5 && date.getUTCDate() >= 14) || (month === 6 && date.getUTCDate() <= 24)
    const chance = drySpell ? 0.02 : 0.34 + 0.14 * Math.cos((2 * Math.PI * month) / 12)
    const falls = random() < chance
    const depth = -6 * Math.log(1 - random())
    return falls ? depth : 0
  })
}

/** Rise of the water table by rain, metres: each fall adds, and drains away with a time constant of 24 days. */
function rainResponse(rain: Float64Array): Float64Array {
  const response = new Float64Array(rain.length)
  let stored = 0
  for (let i = 0; i < rain.length; i++) {
    stored = stored * Math.exp(-1 / 24) + 0.0045 * (rain[i] ?? 0)
    response[i] = stored
  }
  return response
}

const rain = rainResponse(dailyRain())
const meanRain = rain.reduce((sum, value) => sum + value, 0) / rain.length

function trueHead(place: DemoHead, at: number): number {
  const season = 0.16 * Math.cos((2 * Math.PI * (at - Date.UTC(2026, 1, 10))) / (365.25 * day))
  const index = (at - readingsFrom) / day
  const i = Math.min(rain.length - 2, Math.floor(index))
  const wet = (rain[i] ?? 0) + ((rain[i + 1] ?? 0) - (rain[i] ?? 0)) * (index - i) - meanRain
  const tide =
    place.tide *
    (0.22 * Math.cos((2 * Math.PI * at) / (12.42 * hour)) +
      0.07 * Math.cos((2 * Math.PI * at) / (14.76 * day)))
  const pumped = at < pumpingFrom ? 0 : 1 - Math.exp(-(at - pumpingFrom) / (9 * day))
  return place.before + place.offset + season + wet + tide - (place.before - place.during) * pumped
}

function pipeTopAt(place: DemoHead, at: number): number {
  return place.pipeTop.findLast(({ from }) => Date.parse(from) <= at)?.level ?? Number.NaN
}

function two(value: number): string {
  return String(value).padStart(2, '0')
}

function stamp(at: number): string {
  const d = new Date(at)
  return `${two(d.getUTCDate())}/${two(d.getUTCMonth() + 1)}/${d.getUTCFullYear()} ${two(d.getUTCHours())}:${two(d.getUTCMinutes())}`
}

/** Files of one year for all instruments: one a logger, one of hand dips. */
export function demoReadingFiles(places: readonly DemoHead[]): DemoFile[] {
  const files: DemoFile[] = []
  const dips: { at: number; name: string; value: string }[] = []
  places.forEach((place, index) => {
    const random = randomFrom(900 + index)
    if (place.kind === 'standpipe piezometer') {
      for (let at = readingsFrom + 9 * hour; at < readingsTo; at += 7 * day) {
        const visit = at + Math.round((random() - 0.5) * 300) * 60_000
        if (random() < 0.04) {
          dips.push({ at: visit, name: place.name, value: random() < 0.5 ? 'not accessed' : 'obstructed' })
          continue
        }
        const dip = pipeTopAt(place, visit) - trueHead(place, visit) + 0.006 * gaussian(random)
        dips.push({ at: visit, name: place.name, value: dip.toFixed(2) })
      }
      return
    }
    const step = place.kind === 'vibrating-wire' ? 4 * hour : 6 * hour
    const rows: string[] = []
    for (let at = readingsFrom; at < readingsTo; at += step) {
      // One logger stood still for three weeks in spring: its battery.
      if (place.name === 'P7' && at > Date.UTC(2026, 3, 6, 5) && at < Date.UTC(2026, 3, 28, 11)) continue
      const level = trueHead(place, at) + 0.004 * gaussian(random)
      rows.push(
        `${stamp(at)},${level.toFixed(3)},${(11.2 + 0.8 * Math.sin((2 * Math.PI * at) / (365.25 * day)) + 0.05 * gaussian(random)).toFixed(2)}`,
      )
    }
    const header = [
      `Station,${place.name}`,
      `Serial,${7_420_310 + 17 * index}`,
      'Clock,UTC',
      'Level in metres above site datum',
      'Date and time,Water level (m),Temperature (C)',
    ]
    files.push({
      name: `${place.name}_2025-11_2026-11.csv`,
      instrument: place.name,
      text: `${[...header, ...rows].join('\r\n')}\r\n`,
    })
  })
  dips.sort((a, b) => a.at - b.at)
  files.push({
    name: 'hand-dips-2025-2026.csv',
    instrument: null,
    text: `${['Piezometer;Date;Time;Dip (m)', ...dips.map(({ at, name, value }) => `${name};${stamp(at).replace(' ', ';')};${value}`)].join('\r\n')}\r\n`,
  })
  return files
}
