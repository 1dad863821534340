/**
 * What a client's page receives, and all that it receives: an allow-list. No notes, sources, remarks, rates, names of
 * staff or unissued documents.
 */
export interface ProgressView {
  project: {
    number: string
    title: string
    client: string
    unit: 'm' | 'ft'
    /** "m above site datum" */
    levels: string
    timeZone: string
  }
  /** Where the work stands and what comes next, as the project manager wrote it for the client. */
  stage: string
  nextStep: string
  issued: IssuedDocument[]
  instruments: ProgressInstrument[]
  /** Day and text of the comparison in the latest issued package; null while nothing is issued. */
  fit: { day: string; n: number; typical: number; largest: number } | null
}

export interface IssuedDocument {
  id: number
  revision: string
  status: 'issued' | 'superseded'
  purpose: string
  issuedAt: string
  sha256: string
}

export interface ProgressInstrument {
  name: string
  outOfService: boolean
  /** Last head in the project's unit and when it was read, null without one. */
  head: number | null
  headAt: string | null
  /** When the last reading of any sort was taken. */
  at: string | null
  /** "dry", "frozen" … of the last reading. */
  status: string | null
  quality: string | null
  /** Head that the latest issued package predicts here. */
  predicted: number | null
}

/** How old a reading is, in words, by the calendar of the site. */
export function ageWords(at: string | null, now: number, timeZone: string): string {
  if (at === null) return 'never read'
  const day = (instant: number) => {
    const parts = new Intl.DateTimeFormat('en-CA', { timeZone, dateStyle: 'short' }).format(instant)
    return Date.parse(`${parts}T00:00:00Z`) / 86_400_000
  }
  const days = day(now) - day(Date.parse(at))
  if (days <= 0) return 'today'
  if (days === 1) return 'yesterday'
  if (days < 14) return `${days} days ago`
  if (days < 70) return `${Math.round(days / 7)} weeks ago`
  return `${Math.round(days / 30.4)} months ago`
}

export interface Against {
  words: string
  shape: '●' | '▲' | '▼' | '–'
}

/** The head that the last reading gave: none when it found the instrument dry, say, whatever was read before. */
export function presentHead(instrument: Pick<ProgressInstrument, 'head' | 'headAt' | 'at'>): number | null {
  return instrument.headAt === instrument.at ? instrument.head : null
}

/**
 * Measured against predicted in plain words; `near` is how close counts as agreement, in the same unit.
 * Shape as well as word, so that colour carries nothing alone.
 */
export function againstPrediction(measured: number | null, predicted: number | null, near: number): Against {
  if (measured === null || predicted === null) return { words: 'nothing to compare', shape: '–' }
  const difference = measured - predicted
  if (Math.abs(difference) <= near) return { words: 'as predicted', shape: '●' }
  return difference > 0
    ? { words: 'higher than predicted', shape: '▲' }
    : { words: 'lower than predicted', shape: '▼' }
}
