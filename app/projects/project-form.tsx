import { Field, SelectField } from '~/components/field'
import { type FormField, fieldProps } from '~/components/form-field'
import type { ProjectInput } from './project'

/** Grid reference systems that are often wanted; any EPSG code can be typed. */
const gridSystems = [
  ['27700', 'OSGB36 / British National Grid'],
  ['2157', 'IRENET95 / Irish Transverse Mercator'],
  ['29903', 'TM75 / Irish Grid'],
  ['25831', 'ETRS89 / UTM zone 31N'],
  ['25832', 'ETRS89 / UTM zone 32N'],
  ['25833', 'ETRS89 / UTM zone 33N'],
  ['28992', 'Amersfoort / RD New'],
  ['2154', 'RGF93 / Lambert-93'],
  ['31370', 'BD72 / Belgian Lambert 72'],
  ['3006', 'SWEREF99 TM'],
  ['32618', 'WGS 84 / UTM zone 18N'],
  ['32633', 'WGS 84 / UTM zone 33N'],
  ['7856', 'GDA2020 / MGA zone 56'],
  ['2193', 'NZGD2000 / New Zealand Transverse Mercator'],
] as const

const datums = ['site datum', 'Ordnance Datum Newlyn', 'Malin Head', 'NAP', 'NHN', 'NAVD 88']

/** The fields of a project's settings, for a new one and for the settings page. */
export function ProjectFieldset({
  fields,
  timeZones,
}: {
  fields: Record<keyof ProjectInput, FormField>
  timeZones: readonly string[]
}) {
  return (
    <div className="grid gap-x-5 gap-y-4 sm:grid-cols-2">
      <Field {...fieldProps(fields.number)} key={fields.number.key} label="Project number" maxLength={40} />
      <Field
        {...fieldProps(fields.calcReference)}
        key={fields.calcReference.key}
        label="Calculation reference"
        maxLength={60}
        hint="Printed on every page of the package."
      />
      <div className="sm:col-span-2">
        <Field {...fieldProps(fields.title)} key={fields.title.key} label="Title" maxLength={200} />
      </div>
      <div className="sm:col-span-2">
        <Field {...fieldProps(fields.client)} key={fields.client.key} label="Client" maxLength={200} />
      </div>
      <Field
        {...fieldProps(fields.crsEpsg)}
        key={fields.crsEpsg.key}
        label="Grid reference system (EPSG code)"
        inputMode="numeric"
        list={`${fields.crsEpsg.id}-list`}
        hint="Coordinates in metres or feet, not degrees: 27700 is the British National Grid."
      />
      <datalist id={`${fields.crsEpsg.id}-list`}>
        {gridSystems.map(([code, name]) => (
          <option key={code} value={code}>
            {name}
          </option>
        ))}
      </datalist>
      <Field
        {...fieldProps(fields.verticalDatum)}
        key={fields.verticalDatum.key}
        label="Vertical datum"
        maxLength={120}
        list={`${fields.verticalDatum.id}-list`}
        hint="What levels and heads are measured from, such as site datum."
      />
      <datalist id={`${fields.verticalDatum.id}-list`}>
        {datums.map((name) => (
          <option key={name} value={name} />
        ))}
      </datalist>
      <Field
        {...fieldProps(fields.timeZone)}
        key={fields.timeZone.key}
        label="Time zone of the site"
        list={`${fields.timeZone.id}-list`}
        hint="A name such as Europe/London."
      />
      <datalist id={`${fields.timeZone.id}-list`}>
        {timeZones.map((name) => (
          <option key={name} value={name} />
        ))}
      </datalist>
      <div className="grid grid-cols-2 gap-4">
        <SelectField {...fieldProps(fields.lengthUnit)} key={fields.lengthUnit.key} label="Lengths shown in">
          <option value="m">metres (m)</option>
          <option value="ft">feet (ft)</option>
        </SelectField>
        <SelectField {...fieldProps(fields.timeUnit)} key={fields.timeUnit.key} label="Times shown in">
          <option value="d">days (d)</option>
          <option value="s">seconds (s)</option>
        </SelectField>
      </div>
    </div>
  )
}
