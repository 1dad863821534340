import { z } from 'zod'
import type { ProjectUnits } from '~/units'

export interface Project {
  id: number
  number: string
  title: string
  client: string
  calcReference: string
  crsEpsg: number
  verticalDatum: string
  timeZone: string
  units: ProjectUnits
  stage: string
  nextStep: string
  createdAt: Date
}

function isTimeZone(name: string): boolean {
  try {
    new Intl.DateTimeFormat('en', { timeZone: name })
    return true
  } catch (error) {
    if (error instanceof RangeError) return false
    throw error
  }
}

/**
 * "m above site datum": the unit of a level with what it is measured from, whether the project names the datum alone
 * or says "above" as well.
 */
export function levelUnit(length: string, verticalDatum: string): string {
  return /^(above|below|m |ft )/i.test(verticalDatum)
    ? `${length} ${verticalDatum.replace(/^(m|ft) /i, '')}`
    : `${length} above ${verticalDatum}`
}

const line = (max: number, message: string) =>
  z.string({ error: message }).trim().min(1, message).max(max, `At most ${max} characters.`)

export const projectSchema = z.object({
  number: line(40, 'Give the project its number.'),
  title: line(200, 'Give the project a title.'),
  client: line(200, 'Name the client.'),
  calcReference: line(60, 'Give the calculation its reference.'),
  crsEpsg: z.coerce
    .number({ error: 'Give the grid reference system as an EPSG code.' })
    .int('An EPSG code is a whole number.')
    .min(1024, 'EPSG codes start at 1024.')
    .max(32767, 'EPSG codes end at 32767.'),
  verticalDatum: line(120, 'Say what levels are measured from.'),
  timeZone: z
    .string({ error: 'Choose the time zone of the site.' })
    .refine(isTimeZone, 'This is not a time zone name such as Europe/London.'),
  lengthUnit: z.enum(['m', 'ft']),
  timeUnit: z.enum(['d', 's']),
})
export type ProjectInput = z.infer<typeof projectSchema>
