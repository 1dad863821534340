import { type ReactNode, useState } from 'react'
import { Button } from '~/components/button'
import { Field, SelectField } from '~/components/field'
import { type UnitName, unitLabel } from '~/units'
import {
  delimiters,
  delimiterWords,
  encodings,
  encodingWords,
  type FileFormat,
  guessColumns,
} from './file-format'
import type { ImportSettings, SettingsProblems } from './import-settings'
import { instrumentKinds } from './instrument'
import { decimalMarks } from './read-value'
import { quantities, quantityWords, type ReadingQuantity, unitsOfQuantity } from './reading'
import { dateOrders, dateOrderWords } from './time-rules'

/** The form as the page holds it: every choice a text, '' for not chosen yet. */
export interface ImportChoices {
  headerRow: string
  instrumentBy: 'column' | 'one' | 'row'
  instrumentColumn: string
  instrumentId: string
  prefix: string
  /** What becomes of names that are no instrument: an id, 'add' or 'leave out'. */
  names: Record<string, string>
  addsPlaces: boolean
  x: string
  y: string
  placeUnit: string
  placeKind: string
  timeBy: 'columns' | 'fixed'
  date: string
  time: string
  order: string
  timeIfNone: string
  fixedDate: string
  fixedTime: string
  zone: string
  offset: string
  repeated: string
  valueColumn: string
  quantity: string
  unit: string
  decimalMark: string
  status: string
}

function asText(column: number | null): string {
  return column === null ? '' : String(column)
}

/** What the header names is chosen to start with; quantity, unit and time zone rule are left to the person. */
export function startingChoices(headerRow: number, header: readonly string[]): ImportChoices {
  const guess = guessColumns(header)
  const surveyed = guess.date === null && guess.instrument === null && guess.x !== null && guess.y !== null
  return {
    headerRow: String(headerRow),
    instrumentBy: surveyed ? 'row' : guess.instrument === null ? 'one' : 'column',
    instrumentColumn: asText(guess.instrument),
    instrumentId: '',
    prefix: '',
    names: {},
    addsPlaces: false,
    x: asText(guess.x),
    y: asText(guess.y),
    placeUnit: '',
    placeKind: '',
    timeBy: guess.date === null ? 'fixed' : 'columns',
    date: asText(guess.date),
    time: asText(guess.time),
    order: '',
    timeIfNone: '',
    fixedDate: '',
    fixedTime: '12:00',
    zone: '',
    offset: '0',
    repeated: 'refuse',
    valueColumn: asText(guess.value),
    quantity: '',
    unit: '',
    decimalMark: '',
    status: asText(guess.status),
  }
}

/** Choices as an earlier import had them. */
export function choicesOf(settings: ImportSettings): ImportChoices {
  const { instruments, times, zone, value } = settings
  const places = instruments.by === 'one' ? null : instruments.places
  return {
    headerRow: String(settings.headerRow),
    instrumentBy: instruments.by,
    instrumentColumn: instruments.by === 'column' ? String(instruments.column) : '',
    instrumentId: instruments.by === 'one' ? instruments.instrumentId : '',
    prefix: instruments.by === 'row' ? instruments.prefix : '',
    names: instruments.by === 'column' ? instruments.names : {},
    addsPlaces: instruments.by === 'column' && places !== null,
    x: places ? String(places.x) : '',
    y: places ? String(places.y) : '',
    placeUnit: places?.unit ?? '',
    placeKind: places?.kind ?? '',
    timeBy: times.by,
    date: times.by === 'columns' ? String(times.date) : '',
    time: times.by === 'columns' ? asText(times.time) : '',
    order: times.by === 'columns' ? (times.order ?? '') : '',
    timeIfNone: times.by === 'columns' ? (times.timeIfNone ?? '') : '',
    fixedDate: times.by === 'fixed' ? times.date : '',
    fixedTime: times.by === 'fixed' ? times.time : '12:00',
    zone: zone.rule,
    offset: zone.rule === 'offset' ? String(zone.minutes / 60) : '0',
    repeated: zone.rule === 'site' ? zone.repeated : 'refuse',
    valueColumn: String(value.column),
    quantity: value.quantity,
    unit: value.unit,
    decimalMark: value.decimalMark ?? '',
    status: asText(value.status),
  }
}

/** The choices as the server reads them: what is not chosen is left out, and the server says so. */
export function settingsFrom(
  choices: ImportChoices,
  format: FileFormat,
  header: readonly string[],
): Record<string, unknown> {
  const column = (text: string) => (text === '' ? undefined : Number(text))
  const places = {
    x: column(choices.x),
    y: column(choices.y),
    unit: choices.placeUnit || undefined,
    kind: choices.placeKind || undefined,
  }
  const instruments =
    choices.instrumentBy === 'column'
      ? {
          by: 'column',
          column: column(choices.instrumentColumn),
          names: choices.names,
          places: choices.addsPlaces ? places : null,
        }
      : choices.instrumentBy === 'one'
        ? { by: 'one', instrumentId: choices.instrumentId || undefined }
        : { by: 'row', prefix: choices.prefix, places }
  const times =
    choices.timeBy === 'columns'
      ? {
          by: 'columns',
          date: column(choices.date),
          time: column(choices.time) ?? null,
          order: choices.order || null,
          timeIfNone: choices.timeIfNone || null,
        }
      : { by: 'fixed', date: choices.fixedDate || undefined, time: choices.fixedTime }
  const zone =
    choices.zone === 'offset'
      ? {
          rule: 'offset',
          minutes: choices.offset.trim() === '' ? undefined : Math.round(Number(choices.offset) * 60),
        }
      : choices.zone === 'site'
        ? { rule: 'site', repeated: choices.repeated }
        : { rule: choices.zone || undefined }
  return {
    ...format,
    headerRow: choices.headerRow === '' ? undefined : Number(choices.headerRow),
    instruments,
    times,
    zone,
    value: {
      column: column(choices.valueColumn),
      quantity: choices.quantity || undefined,
      unit: choices.unit || undefined,
      decimalMark: choices.decimalMark || null,
      status: column(choices.status) ?? null,
    },
    header: header.map((cell) => cell.trim()),
  }
}

interface FormProps {
  choices: ImportChoices
  onChange: (choices: Partial<ImportChoices>) => void
  problems: SettingsProblems
  header: readonly string[]
  columns: number
  instruments: readonly { id: string; name: string }[]
  siteZone: string
}

/** A column as its header names it, with its letter in a spreadsheet. */
export function columnName(index: number, header: readonly string[]): string {
  const letter = index < 26 ? String.fromCharCode(65 + index) : `A${String.fromCharCode(65 + (index % 26))}`
  const name = header[index]?.trim()
  return name ? `${letter}: ${name}` : letter
}

function Group({ title, children, note }: { title: string; children: ReactNode; note?: ReactNode }) {
  return (
    <fieldset className="mb-4 border-t border-rule pt-2.5">
      <legend className="pr-3 font-semibold">{title}</legend>
      {note && <p className="mb-2 text-[0.9rem] text-flint-2">{note}</p>}
      <div className="grid items-start gap-x-4 gap-y-3 sm:grid-cols-2 lg:grid-cols-3">{children}</div>
    </fieldset>
  )
}

/** What each column means: instruments, times, values. */
export function ImportForm(props: FormProps) {
  return (
    <>
      <InstrumentChoices {...props} />
      <TimeChoices {...props} />
      <ValueChoices {...props} />
    </>
  )
}

/** One choice of the form with its problem below it. */
function Choice({
  props,
  name,
  path,
  label,
  hint,
  children,
}: {
  props: FormProps
  name: keyof ImportChoices
  path: string
  label: string
  hint?: ReactNode
  children: ReactNode
}) {
  const problem = props.problems[path]
  return (
    <SelectField
      label={label}
      hint={hint}
      errors={problem ? [problem] : undefined}
      value={String(props.choices[name])}
      onChange={(event) => props.onChange({ [name]: event.target.value })}
    >
      {children}
    </SelectField>
  )
}

function ColumnOptions({ props, none = 'choose …' }: { props: FormProps; none?: string }) {
  return (
    <>
      <option value="">{none}</option>
      {Array.from({ length: props.columns }, (_, index) => (
        // biome-ignore lint/suspicious/noArrayIndexKey: a column is its index
        <option key={index} value={index}>
          {columnName(index, props.header)}
        </option>
      ))}
    </>
  )
}

function InstrumentChoices(props: FormProps) {
  const { choices, onChange, problems, instruments } = props
  const by = choices.instrumentBy
  return (
    <Group title="Instruments">
      <SelectField
        label="Which instrument was read"
        value={by}
        onChange={(event) => onChange({ instrumentBy: event.target.value as ImportChoices['instrumentBy'] })}
      >
        <option value="column">named in a column</option>
        <option value="one">one for the whole file</option>
        <option value="row">each row is a place of its own (a survey)</option>
      </SelectField>
      {by === 'column' && (
        <>
          <Choice props={props} name="instrumentColumn" path="instruments.column" label="Column of the names">
            <ColumnOptions props={props} />
          </Choice>
          <SelectField
            label="Names that are no instrument"
            value={choices.addsPlaces ? 'yes' : 'no'}
            onChange={(event) => onChange({ addsPlaces: event.target.value === 'yes' })}
          >
            <option value="no">are listed and asked about</option>
            <option value="yes">may become instruments, by their coordinates</option>
          </SelectField>
        </>
      )}
      {by === 'one' && (
        <Choice
          props={props}
          name="instrumentId"
          path="instruments.instrumentId"
          label="Instrument"
          hint={
            instruments.length === 0 ? 'There is no instrument yet: add one in section 6.1 first.' : undefined
          }
        >
          <option value="">choose …</option>
          {instruments.map(({ id, name }) => (
            <option key={id} value={id}>
              {name}
            </option>
          ))}
        </Choice>
      )}
      {by === 'row' && (
        <Field
          label="Prefix of the names"
          hint="OW gives OW-01, OW-02, … in the order of the rows."
          value={choices.prefix}
          maxLength={20}
          errors={problems['instruments.prefix'] ? [problems['instruments.prefix']] : undefined}
          onChange={(event) => onChange({ prefix: event.target.value })}
        />
      )}
      {(by === 'row' || (by === 'column' && choices.addsPlaces)) && (
        <>
          <Choice props={props} name="x" path="instruments.places.x" label="Column of x (easting)">
            <ColumnOptions props={props} />
          </Choice>
          <Choice props={props} name="y" path="instruments.places.y" label="Column of y (northing)">
            <ColumnOptions props={props} />
          </Choice>
          <Choice
            props={props}
            name="placeUnit"
            path="instruments.places.unit"
            label="Unit of the coordinates"
          >
            <option value="">choose …</option>
            {(['m', 'km', 'ft', 'ftUS'] as UnitName[]).map((unit) => (
              <option key={unit} value={unit}>
                {unitLabel(unit)}
              </option>
            ))}
          </Choice>
          <Choice
            props={props}
            name="placeKind"
            path="instruments.places.kind"
            label="Kind of the new instruments"
          >
            <option value="">choose …</option>
            {instrumentKinds.map((kind) => (
              <option key={kind}>{kind}</option>
            ))}
          </Choice>
        </>
      )}
    </Group>
  )
}

function TimeChoices(props: FormProps) {
  const { choices, onChange, problems, siteZone } = props
  return (
    <Group title="Date and time">
      <SelectField
        label="When it was read"
        value={choices.timeBy}
        onChange={(event) => onChange({ timeBy: event.target.value as ImportChoices['timeBy'] })}
      >
        <option value="columns">stands in columns</option>
        <option value="fixed">one date for the whole file</option>
      </SelectField>
      {choices.timeBy === 'columns' ? (
        <>
          <Choice props={props} name="date" path="times.date" label="Column of the date, or of date and time">
            <ColumnOptions props={props} />
          </Choice>
          <Choice props={props} name="time" path="times.time" label="Column of the time">
            <ColumnOptions props={props} none="none: it stands with the date" />
          </Choice>
          <Choice
            props={props}
            name="order"
            path="times.order"
            label="Order of the date"
            hint="Proven over the whole file; asked only where the file allows two orders."
          >
            <option value="">as the file proves it</option>
            {dateOrders.map((order) => (
              <option key={order} value={order}>
                {dateOrderWords[order]}
              </option>
            ))}
          </Choice>
          <Field
            label="Rows with a date only are taken at"
            type="time"
            hint="Left blank, such rows are refused."
            value={choices.timeIfNone}
            errors={problems['times.timeIfNone'] ? [problems['times.timeIfNone']] : undefined}
            onChange={(event) => onChange({ timeIfNone: event.target.value })}
          />
        </>
      ) : (
        <>
          <Field
            label="Date"
            type="date"
            value={choices.fixedDate}
            errors={problems['times.date'] ? [problems['times.date']] : undefined}
            onChange={(event) => onChange({ fixedDate: event.target.value })}
          />
          <Field
            label="Time"
            type="time"
            value={choices.fixedTime}
            errors={problems['times.time'] ? [problems['times.time']] : undefined}
            onChange={(event) => onChange({ fixedTime: event.target.value })}
          />
        </>
      )}
      <Choice
        props={props}
        name="zone"
        path={problems.zone ? 'zone' : 'zone.rule'}
        label="Time zone rule"
        hint="Which clock these times were read from. Stored in UTC."
      >
        <option value="">choose …</option>
        <option value="site">{siteZone}, with its clock changes</option>
        <option value="offset">a clock without changes, so many hours from UTC</option>
        <option value="utc">UTC</option>
        <option value="written">as written: each time carries its offset</option>
      </Choice>
      {choices.zone === 'offset' && (
        <Field
          label="Hours from UTC"
          type="number"
          step="0.25"
          min={-14}
          max={14}
          hint="East is positive: 1 for UTC+01:00."
          value={choices.offset}
          errors={problems['zone.minutes'] ? [problems['zone.minutes']] : undefined}
          onChange={(event) => onChange({ offset: event.target.value })}
        />
      )}
      {choices.zone === 'site' && (
        <Choice
          props={props}
          name="repeated"
          path="zone.repeated"
          label="The hour that happens twice"
          hint="When clocks go back in autumn."
        >
          <option value="refuse">refuse such rows</option>
          <option value="in order">as the rows of an instrument run on</option>
          <option value="first">the first time round</option>
          <option value="second">the second time round</option>
        </Choice>
      )}
    </Group>
  )
}

function ValueChoices(props: FormProps) {
  const { choices, onChange } = props
  const quantity = choices.quantity as ReadingQuantity | ''
  return (
    <Group
      title="Values"
      note="Words such as dry, flowing or not accessed become a status; < and > stay with their number."
    >
      <Choice props={props} name="valueColumn" path="value.column" label="Column of the value">
        <ColumnOptions props={props} />
      </Choice>
      <SelectField
        label="What was measured"
        errors={props.problems['value.quantity'] ? [props.problems['value.quantity']] : undefined}
        value={choices.quantity}
        onChange={(event) => onChange({ quantity: event.target.value, unit: '' })}
      >
        <option value="">choose …</option>
        {quantities.map((one) => (
          <option key={one} value={one}>
            {quantityWords[one]}
          </option>
        ))}
      </SelectField>
      <Choice
        props={props}
        name="unit"
        path="value.unit"
        label="Unit"
        hint={quantity === 'pressure head' ? 'A pressure becomes metres of water at 1000 kg/m³.' : undefined}
      >
        <option value="">{quantity ? 'choose …' : 'first say what was measured'}</option>
        {quantity &&
          unitsOfQuantity(quantity).map((unit) => (
            <option key={unit} value={unit}>
              {unitLabel(unit)}
            </option>
          ))}
      </Choice>
      <Choice props={props} name="decimalMark" path="value.decimalMark" label="Decimal mark">
        <option value="">as the file proves it</option>
        {decimalMarks.map((mark) => (
          <option key={mark} value={mark}>
            {mark === 'point' ? 'point: 12.5' : 'comma: 12,5'}
          </option>
        ))}
      </Choice>
      <Choice props={props} name="status" path="value.status" label="Column of a status or remark">
        <ColumnOptions props={props} none="none" />
      </Choice>
    </Group>
  )
}

/** The first rows as they are cut into cells, and what the cut depends on. */
export function FileSampleTable({
  rows,
  headerRow,
  format,
  onFormat,
  onHeaderRow,
  problem,
}: {
  rows: readonly (readonly string[])[]
  headerRow: string
  format: FileFormat
  onFormat: (format: FileFormat) => void
  onHeaderRow: (text: string) => void
  problem?: string
}) {
  const [all, setAll] = useState(false)
  const shown = all ? rows : rows.slice(0, 10)
  const width = Math.max(1, ...rows.map((row) => row.length))
  return (
    <>
      <div className="mb-3 grid items-start gap-x-4 gap-y-3 sm:grid-cols-3">
        <SelectField
          label="Encoding"
          value={format.encoding}
          onChange={(event) =>
            onFormat({ ...format, encoding: event.target.value as FileFormat['encoding'] })
          }
        >
          {encodings.map((one) => (
            <option key={one} value={one}>
              {encodingWords[one]}
            </option>
          ))}
        </SelectField>
        <SelectField
          label="Columns are parted by"
          value={format.delimiter}
          onChange={(event) =>
            onFormat({ ...format, delimiter: event.target.value as FileFormat['delimiter'] })
          }
        >
          {delimiters.map((one) => (
            <option key={one} value={one}>
              {delimiterWords[one]}
            </option>
          ))}
        </SelectField>
        <Field
          label="Row with the column names"
          type="number"
          min={0}
          max={1000}
          hint="0 for none. Readings start below it."
          value={headerRow}
          errors={problem ? [problem] : undefined}
          onChange={(event) => onHeaderRow(event.target.value)}
        />
      </div>
      {/* biome-ignore lint/a11y/noNoninteractiveTabindex: a region that scrolls must be reachable by keyboard */}
      <section className="overflow-x-auto border border-rule" tabIndex={0} aria-label="First rows">
        <table className="w-full border-collapse text-[0.9rem]">
          <caption className="sr-only">First rows of the file</caption>
          <thead>
            <tr className="border-b border-rule bg-chalk-2 text-flint-2">
              <th scope="col" className="px-2 py-1 text-right font-normal">
                row
              </th>
              {Array.from({ length: width }, (_, index) => (
                // biome-ignore lint/suspicious/noArrayIndexKey: a column is its index
                <th key={index} scope="col" className="px-2 py-1 text-left font-normal">
                  {columnName(index, [])}
                </th>
              ))}
            </tr>
          </thead>
          <tbody>
            {shown.map((row, index) => {
              const number = index + 1
              const place = Number(headerRow)
              return (
                <tr
                  // biome-ignore lint/suspicious/noArrayIndexKey: a row is its place in the file
                  key={index}
                  className={`border-b border-rule last:border-b-0 ${
                    number === place ? 'bg-bourne-2 font-semibold' : number < place ? 'text-flint-2' : ''
                  }`}
                >
                  <td className="px-2 py-1 text-right text-flint-2">{number}</td>
                  {Array.from({ length: width }, (_, column) => (
                    // biome-ignore lint/suspicious/noArrayIndexKey: a column is its index
                    <td key={column} className="px-2 py-1 whitespace-nowrap">
                      {row[column] ?? ''}
                    </td>
                  ))}
                </tr>
              )
            })}
          </tbody>
        </table>
      </section>
      {rows.length > 10 && (
        <Button look="quiet" className="screen-only mt-2" onClick={() => setAll(!all)}>
          {all ? 'Show fewer rows' : `Show ${rows.length} rows`}
        </Button>
      )}
    </>
  )
}
