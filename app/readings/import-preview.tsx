import { Button } from '~/components/button'
import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { Notice } from '~/components/notice'
import { convert, formatNumber, type UnitName, unitLabel } from '~/units'
import type { ImportCounts, ImportPreview, ImportSettings, InstrumentSummary } from './import-settings'
import { type DateOrder, dateOrderWords } from './time-rules'

function rows(count: number): string {
  return `${formatNumber(count, 0)} ${count === 1 ? 'row' : 'rows'}`
}

/** The rows of a file as a sum: what became, or would become, of each. */
export function CountsLine({ counts, committed = false }: { counts: ImportCounts; committed?: boolean }) {
  const parts = [
    { label: committed ? 'accepted' : 'would be added', count: counts.accepted, colour: 'text-moss' },
    { label: 'identical to what is there', count: counts.identical, colour: '' },
    { label: 'in conflict', count: counts.conflicts, colour: counts.conflicts > 0 ? 'text-ochre' : '' },
    { label: 'refused', count: counts.refused, colour: counts.refused > 0 ? 'text-madder' : '' },
  ]
  return (
    <p className="mb-3 flex flex-wrap items-baseline gap-x-3 gap-y-1 border border-rule bg-chalk-2 px-3 py-2">
      <span>
        <b className="text-[1.2rem] font-semibold">{formatNumber(counts.rows, 0)}</b> rows in the file
      </span>
      {parts.map(({ label, count, colour }, index) => (
        <span key={label}>
          <span aria-hidden className="mr-3 text-flint-2">
            {index === 0 ? '=' : '+'}
          </span>
          <b className={`text-[1.2rem] font-semibold ${colour}`}>{formatNumber(count, 0)}</b> {label}
        </span>
      ))}
    </p>
  )
}

/** How the file proves what was left to it: the order of its dates, its decimal mark. */
export function ProofLines({ preview, timeZone }: { preview: ImportPreview; timeZone: string }) {
  const { dates, decimals } = preview
  const clock = localTime('UTC')
  const chosen = dates?.tallies.find((tally) => tally.order === dates.chosen)
  const others = dates?.tallies.filter((tally) => tally.order !== dates.chosen) ?? []
  return (
    <ul className="mb-3 list-disc pl-5 text-[0.95rem]">
      {dates && chosen && (
        <li>
          Dates are read {dateOrderWords[chosen.order as DateOrder].split(':')[0]}: {rows(chosen.fits)} can be
          read so
          {others.length === 0
            ? ', and in no other order'
            : `, against ${others.map((one) => `${formatNumber(one.fits, 0)} ${one.order}`).join(' and ')}`}
          {dates.proven ? '.' : '. This was chosen; the file does not prove it.'}
          {chosen.first && chosen.last && (
            <>
              {' '}
              By the file’s own clock they run from {clock.minute(chosen.first)} to{' '}
              {clock.minute(chosen.last)}.
            </>
          )}
        </li>
      )}
      {decimals.chosen && (
        <li>
          The decimal mark is a {decimals.chosen}
          {decimals.point + decimals.comma > 0
            ? `: ${rows(decimals.chosen === 'point' ? decimals.point : decimals.comma)} can be read in no other way.`
            : decimals.either > 0
              ? ': every value has three digits behind it, so that is how they are read.'
              : '; no value has decimals.'}
        </li>
      )}
      {preview.blank > 0 && <li>{rows(preview.blank)} below the header are blank and are not counted.</li>}
      {preview.bounds > 0 && <li>{rows(preview.bounds)} give a bound (&lt; or &gt;): kept, and no head.</li>}
      {Object.entries(preview.statuses).map(([status, count]) => (
        <li key={status}>
          {rows(count)} with the status <b className="font-semibold">{status}</b>.
        </li>
      ))}
      {preview.otherWords.length > 0 && (
        <li>
          Words in the status column that are no status, and are not taken:{' '}
          {preview.otherWords.map(({ word, rows: count }) => `“${word}” (${count})`).join(', ')}.
        </li>
      )}
      {preview.unreadable > 0 && (
        <li className="text-madder">
          {rows(preview.unreadable)} hold characters that this encoding does not know: try Windows-1252.
        </li>
      )}
      <li>Times below are shown in {timeZone} and stored in UTC.</li>
    </ul>
  )
}

/** What only a person can say, with what the file shows for either answer. */
export function Question({
  preview,
  onOrder,
  onMark,
  busy,
}: {
  preview: ImportPreview
  onOrder: (order: string) => void
  onMark: (mark: string) => void
  busy: boolean
}) {
  if (preview.question === 'date order' && preview.dates) {
    const clock = localTime('UTC')
    const best = Math.max(...preview.dates.tallies.map((tally) => tally.fits))
    return (
      <Notice tone="warn" title="The file allows more than one order of the date. Which one is it?" live>
        <ul className="mt-2 grid gap-2">
          {preview.dates.tallies
            .filter((tally) => tally.fits === best)
            .map((tally) => (
              <li key={tally.order} className="flex flex-wrap items-center gap-x-3 gap-y-1">
                <Button disabled={busy} onClick={() => onOrder(tally.order)}>
                  {dateOrderWords[tally.order as DateOrder]}
                </Button>
                <span>
                  {tally.first && tally.last && `${clock.day(tally.first)} to ${clock.day(tally.last)}; `}
                  {tally.backwards === 0
                    ? 'the times run forward all the way'
                    : `the times step back ${tally.backwards} ${tally.backwards === 1 ? 'time' : 'times'}`}
                </span>
              </li>
            ))}
        </ul>
      </Notice>
    )
  }
  if (preview.question === 'decimal mark') {
    return (
      <Notice
        tone="warn"
        title="Values such as 1,234 may be one and a bit, or more than a thousand. Which one is it?"
        live
      >
        <p className="mt-2 flex flex-wrap gap-2">
          <Button disabled={busy} onClick={() => onMark('comma')}>
            1,234 is 1.234 (decimal comma)
          </Button>
          <Button disabled={busy} onClick={() => onMark('point')}>
            1,234 is 1234 (decimal point)
          </Button>
        </p>
      </Notice>
    )
  }
  return null
}

/** Names of the file that are no instrument, each with what to do about it. */
export function UnknownNames({
  preview,
  names,
  instruments,
  addsPlaces,
  onName,
  onAddAll,
  onRead,
  busy,
}: {
  preview: ImportPreview
  names: Record<string, string>
  instruments: readonly { id: string; name: string }[]
  addsPlaces: boolean
  onName: (name: string, answer: string) => void
  onAddAll: (names: string[]) => void
  onRead: () => void
  busy: boolean
}) {
  if (preview.unknownNames.length === 0) return null
  const shown = preview.unknownNames.slice(0, 100)
  return (
    <Notice
      tone="warn"
      title={
        preview.unknownNames.length === 1
          ? 'One name in the file is no instrument of this project'
          : `${preview.unknownNames.length} names in the file are no instrument of this project`
      }
    >
      <p className="mb-2">
        Their rows are refused until you say what is meant
        {addsPlaces ? '.' : '. To add them as instruments, give the columns of their coordinates above.'}
      </p>
      <ul className="grid gap-1.5">
        {shown.map(({ name, rows: count }) => (
          <li
            key={name}
            className="grid grid-cols-[minmax(5rem,1fr)_minmax(5rem,auto)_minmax(9rem,16rem)] items-center gap-3"
          >
            <b className="truncate font-semibold">{name}</b>
            <span className="text-flint-2">{rows(count)}</span>
            <select
              aria-label={`What ${name} is`}
              className="w-full rounded border border-rule bg-chalk px-2 py-1"
              value={names[name] ?? ''}
              onChange={(event) => onName(name, event.target.value)}
            >
              <option value="">not decided</option>
              {addsPlaces && <option value="add">a new instrument</option>}
              <option value="leave out">leave its rows out</option>
              {instruments.map((instrument) => (
                <option key={instrument.id} value={instrument.id}>
                  is {instrument.name}
                </option>
              ))}
            </select>
          </li>
        ))}
      </ul>
      {preview.unknownNames.length > shown.length && (
        <p className="mt-1">and {preview.unknownNames.length - shown.length} more.</p>
      )}
      <p className="mt-2 flex flex-wrap gap-2">
        {addsPlaces && (
          <Button disabled={busy} onClick={() => onAddAll(preview.unknownNames.map(({ name }) => name))}>
            All are new instruments
          </Button>
        )}
        <Button disabled={busy} onClick={onRead}>
          Read the file again
        </Button>
      </p>
    </Notice>
  )
}

/** Per instrument: how many rows, from when to when, between which values. */
export function InstrumentTable({
  instruments,
  settings,
  timeZone,
}: {
  instruments: readonly InstrumentSummary[]
  settings: Pick<ImportSettings, 'value'>
  timeZone: string
}) {
  const clock = localTime(timeZone)
  const { quantity, unit } = settings.value
  const shown = (value: number | null) =>
    value === null ? '–' : formatNumber(convert({ value, unit: 'm' }, unit as UnitName), 3)
  return (
    <DataTable
      caption="Readings by instrument"
      rows={[...instruments]}
      rowKey={(row) => row.id}
      empty="No row of the file belongs to an instrument."
      columns={[
        { head: 'Instrument', cell: (row) => row.name, words: true },
        { head: 'New', cell: (row) => (row.isNew ? 'new' : '–'), words: true },
        { head: 'Rows', cell: (row) => formatNumber(row.rows, 0) },
        { head: 'First', cell: (row) => clock.minute(row.firstAt) },
        { head: 'Last', cell: (row) => clock.minute(row.lastAt) },
        { head: `Least ${quantity}`, unit: unitLabel(unit as UnitName), cell: (row) => shown(row.low) },
        { head: `Greatest ${quantity}`, unit: unitLabel(unit as UnitName), cell: (row) => shown(row.high) },
      ]}
    />
  )
}

/** Rows that would be refused, with the reason of each; the first two hundred of them. */
export function RefusedRows({ preview }: { preview: ImportPreview }) {
  if (preview.counts.refused === 0) return null
  return (
    <details className="my-3" open={preview.refusedRows.length <= 20}>
      <summary className="font-semibold text-madder">{rows(preview.counts.refused)} refused</summary>
      <ul className="my-2 list-disc pl-5 text-[0.95rem]">
        {preview.reasons.map(({ reason, rows: count }) => (
          <li key={reason}>
            {rows(count)}: {reason}
          </li>
        ))}
      </ul>
      <DataTable
        caption="Refused rows"
        rows={preview.refusedRows}
        rowKey={(row) => row.row}
        columns={[
          { head: 'Row', cell: (row) => row.row },
          { head: 'Stands there', cell: (row) => <code>{row.cells || '(blank)'}</code>, words: true },
          { head: 'Why it is refused', cell: (row) => row.reason, words: true },
        ]}
      />
      {preview.counts.refused > preview.refusedRows.length && (
        <p className="mt-1 text-[0.9rem] text-flint-2">
          The first {preview.refusedRows.length}; the receipt has all of them.
        </p>
      )}
    </details>
  )
}

/** Rows that contradict what is there, with both values. */
export function ConflictRows({ preview, timeZone }: { preview: ImportPreview; timeZone: string }) {
  if (preview.counts.conflicts === 0) return null
  const clock = localTime(timeZone)
  return (
    <details className="my-3" open>
      <summary className="font-semibold text-ochre">
        {rows(preview.counts.conflicts)} in conflict with what is there
      </summary>
      <div className="mt-2">
        <DataTable
          caption="Rows in conflict"
          rows={preview.conflictRows}
          rowKey={(row) => row.row}
          columns={[
            { head: 'Row', cell: (row) => row.row },
            { head: 'Instrument', cell: (row) => row.instrument, words: true },
            { head: 'Time', cell: (row) => clock.minute(row.at) },
            { head: 'In the file', unit: conflictUnit(preview), cell: (row) => row.entered },
            { head: 'There now', unit: conflictUnit(preview), cell: (row) => row.existing },
          ]}
        />
      </div>
    </details>
  )
}

function conflictUnit(preview: ImportPreview): string | undefined {
  const unit = preview.conflictRows[0]?.unit
  return unit && unitLabel(unit as UnitName)
}
