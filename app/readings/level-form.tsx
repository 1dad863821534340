import { useEffect, useState } from 'react'
import { useFetcher } from 'react-router'
import { Button } from '~/components/button'
import { Field, SelectField } from '~/components/field'
import { Notice } from '~/components/notice'
import type { ProjectUnits } from '~/units'
import { levelledParts } from './instrument'

/** A reference level as a person enters it: date and time as the site's clock shows them, the level as text. */
export interface LevelEntry {
  date: string
  time: string
  level: string
  levelled: string
  reason: string
  source: string
}

export interface LevelAnswer {
  saved: boolean
  /** By field of the entry; '' for the row as a whole. */
  problems: Record<string, string>
}

const blank: LevelEntry = {
  date: '',
  time: '00:00',
  level: '',
  levelled: 'pipe top',
  reason: '',
  source: '',
}

/** Adds a reference level to an instrument's history, or corrects one. Sends to the action of the page it stands on. */
export function LevelForm({
  units,
  edited,
  onDone,
}: {
  units: ProjectUnits
  /** The row that is corrected, with what the form starts from; without it a level is added. */
  edited?: { id: string; version: number; entry: LevelEntry }
  onDone: () => void
}) {
  const [entry, setEntry] = useState<LevelEntry>(edited?.entry ?? blank)
  const fetcher = useFetcher<LevelAnswer>()
  const problems = fetcher.data?.problems ?? {}
  const saved = fetcher.state === 'idle' && fetcher.data?.saved === true
  useEffect(() => {
    if (saved) onDone()
  }, [saved, onDone])

  function field(name: keyof LevelEntry) {
    return {
      value: entry[name],
      errors: problems[name] ? [problems[name]] : undefined,
      onChange: (event: { target: { value: string } }) =>
        setEntry((before) => ({ ...before, [name]: event.target.value })),
    }
  }

  function send() {
    const row = edited && { id: edited.id, version: edited.version }
    void fetcher.submit(JSON.stringify({ intent: 'save level', row, entry }), {
      method: 'post',
      encType: 'application/json',
    })
  }

  return (
    <form
      noValidate
      className="screen-only my-3 border border-rule bg-chalk-2 p-3"
      onSubmit={(event) => {
        event.preventDefault()
        send()
      }}
    >
      {problems[''] && <Notice tone="alarm" title={problems['']} live />}
      <div className="grid items-start gap-x-4 gap-y-3 sm:grid-cols-2 lg:grid-cols-3">
        <Field label="In force from (site date)" type="date" {...field('date')} />
        <Field label="at (site time)" type="time" {...field('time')} />
        <Field
          label={`Level (${units.length})`}
          inputMode="decimal"
          hint="Another unit may stand behind it: 335.6 ft."
          {...field('level')}
        />
        <SelectField
          label="What was levelled"
          hint="Dips hang from a pipe top, cover, ground or flange; a pressure head stands on the sensor."
          {...field('levelled')}
        >
          {levelledParts.map((part) => (
            <option key={part}>{part}</option>
          ))}
        </SelectField>
        <Field label="Reason" hint="First survey, casing cut, resurvey." {...field('reason')} />
        <Field label="Source" hint="Survey sheet, person." {...field('source')} />
      </div>
      <div className="mt-3 flex gap-2">
        <Button type="submit" look="primary" disabled={fetcher.state !== 'idle'}>
          {edited ? 'Save the correction' : 'Add the reference level'}
        </Button>
        <Button onClick={onDone}>Cancel</Button>
      </div>
    </form>
  )
}
