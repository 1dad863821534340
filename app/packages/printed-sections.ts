import { DateTime } from 'luxon'
import type { Content } from 'pdfmake/interfaces'
import { lineLength, signedArea, type Vertex } from '~/book/field'
import { sections } from '~/book/sections'
import { defaultTolerance } from '~/cases/case'
import { acceptanceInWords, acceptanceOf } from '~/heads/acceptance'
import { byGravity, kernelsInWords, methodWords, mostBalanceError, severityWords } from '~/heads/account'
import type { HeadField } from '~/heads/field'
import { momentInWords, resultAt, storageFlow, totalFlow } from '~/heads/moment'
import { bandInWords, bandMeaning, verificationLines } from '~/heads/verification'
import { levelUnit } from '~/projects/project'
import { decodeHeads } from '~/solver/heads-buffer'
import {
  convert,
  type Dimension,
  formatNumber,
  formatSigned,
  type Quantity,
  shownUnit,
  unitLabel,
} from '~/units'
import { drawdownFigure, headsFigure, oneToOneFigure, residualFigure } from './figures'
import type { DrawRequest, GatheredContent, GatheredCover } from './gathered'
import {
  alarm,
  bullets,
  caution,
  facts,
  figure,
  grey,
  keptWhole,
  labelled,
  notStated,
  type Piece,
  section,
  sourcedTable,
  subsection,
  table,
  text,
} from './typeset'

/** Sections 1 to 9 of the book as they are printed, numbered as on the pages. */
export function printedSections(given: DrawRequest): Content[] {
  const { cover } = given
  const content = atTheEnd(given.content)
  const request = { ...given, content }
  return [
    ...basisSection(content),
    ...groundSection(content),
    ...waterSection(content),
    ...casesSection(content),
    ...headsSection(request),
    ...readingsSection(content),
    ...fitSection(request),
    ...checksSection(content),
    ...packageSection(content, cover),
  ]
}

/** Of runs in time the package prints the end: head fields are read so too, and section 4 says it. */
function atTheEnd(content: GatheredContent): GatheredContent {
  const { run, against } = content
  return {
    ...content,
    run: { ...run, result: resultAt(run.result) },
    against: against && { ...against, result: resultAt(against.result) },
  }
}

function inUnit(content: GatheredContent, dimension: Dimension) {
  const unit = shownUnit(dimension, content.project.units)
  return {
    unit: unitLabel(unit),
    show: (q: Quantity | null | undefined, decimals?: number) =>
      q ? formatNumber(convert(q, unit), decimals) : '–',
  }
}

/** An instant by the site's clock. */
export function localTime(content: GatheredContent, iso: string | null): string {
  if (!iso) return '–'
  return DateTime.fromISO(iso, { zone: content.project.timeZone })
    .setLocale('en-GB')
    .toFormat('d LLL yyyy HH:mm')
}

/** The day of an instant by the site's calendar. */
export function localDay(content: GatheredContent, iso: string | null): string {
  if (!iso) return '–'
  return DateTime.fromISO(iso, { zone: content.project.timeZone }).setLocale('en-GB').toFormat('d LLL yyyy')
}

// ---- 1 Basis --------------------------------------------------------------------------------------------------

function basisSection(content: GatheredContent): Content[] {
  const { basis, project } = content
  const { length, time } = project.units
  const rate = unitLabel(shownUnit('rate', project.units))
  const symbols: [symbol: string, meaning: string, unit: string][] = [
    ['h', 'head above the vertical datum', length],
    [
      'K, T',
      'hydraulic conductivity; transmissivity, K × thickness',
      `${length}/${time}, ${length}²/${time}`,
    ],
    ['R, Q', 'recharge; rate of a well', `${length}/${time}, ${rate}`],
    ['α', 'conductance of a head-dependent flux or drain, for each unit of line', `${length}/${time}`],
    ['Δh', 'drawdown: head of the run compared with, less head of the run of record', length],
    ['Ω', 'area of the model; where no boundary stands on its edge, nothing flows across', `${length}²`],
  ]
  return section(
    1,
    'Basis',
    subsection(
      '1.1',
      'Question and use',
      ...(basis
        ? [
            ...labelled('Question', basis.question),
            ...labelled('Accuracy needed', basis.accuracy),
            ...labelled('Intended use', basis.intendedUse),
            ...labelled('Not for', basis.notFor),
          ]
        : [text({ text: 'Section 1 of the book is empty.', color: alarm })]),
    ),
    subsection(
      '1.2',
      'Idealisation and governing equation',
      ...labelled('Idealisation', basis?.idealisation),
      text([
        'Steady flow in plan:  ',
        {
          text: '∂/∂x (Tx ∂h/∂x) + ∂/∂y (Ty ∂h/∂y) + R − Σ Q/A = 0  in Ω',
          bold: true,
        },
        ', with T = K × thickness where confined and K × saturated thickness where unconfined, and the wells spread over the area A of their cell. ',
        'A head-dependent flux lets in α (level − h) along its line. Inflow to the model is positive. ',
        'Through any closed line flows what is recharged less what is pumped inside.',
      ]),
      table(
        '1.1',
        'Symbols',
        [
          { head: 'Symbol', cell: ([symbol]) => symbol },
          { head: 'Meaning', words: true, cell: ([, meaning]) => meaning },
          { head: 'Unit', words: true, cell: ([, , unit]) => unit },
        ],
        symbols,
      ),
    ),
    subsection(
      '1.3',
      'Assumptions register',
      sourcedTable(
        '1.2',
        'Assumptions',
        [
          { head: 'No.', cell: (a) => a.reference },
          { head: 'Statement', words: true, cell: (a) => a.statement },
          { head: 'Why', words: true, cell: (a) => a.why || '–' },
          { head: 'Effect', words: true, cell: (a) => a.effect || '–' },
        ],
        content.assumptions,
      ),
    ),
    subsection(
      '1.4',
      'Standards and guides used',
      table(
        '1.3',
        'Standards and guides',
        [
          { head: 'Title', cell: (s) => s.title },
          { head: 'Edition', words: true, cell: (s) => s.edition || '–' },
          { head: 'Status', words: true, cell: (s) => s.status },
          { head: 'Used for', words: true, cell: (s) => s.use || '–' },
        ],
        content.standards,
      ),
    ),
    subsection(
      '1.5',
      'Units and datums',
      facts([
        ['Length and time', `${length}, ${time}`],
        ['Vertical datum', project.verticalDatum],
        ['Grid reference system', `EPSG:${project.crsEpsg}`],
        ['Time zone of the site', project.timeZone],
      ]),
    ),
  )
}

// ---- 2 Ground -------------------------------------------------------------------------------------------------

function groundSection(content: GatheredContent): Content[] {
  const k = inUnit(content, 'conductivity')
  const level = inUnit(content, 'length')
  const ss = inUnit(content, 'per length')
  const name = new Map(content.materials.map((m) => [m.id, m.name]))
  return section(
    2,
    'Ground',
    subsection(
      '2.1',
      'Materials',
      text(
        'Hydraulic conductivity K (permeability k) along x and y in plan, with the range that the source supports.',
      ),
      sourcedTable(
        '2.1',
        'Materials',
        [
          { head: 'Material', cell: (m) => m.name },
          { head: 'Kx', unit: k.unit, cell: (m) => k.show(m.kx) },
          { head: 'Ky', unit: k.unit, cell: (m) => k.show(m.ky) },
          {
            head: 'Range',
            unit: k.unit,
            optional: true,
            cell: (m) => (m.kLow || m.kHigh ? `${k.show(m.kLow)} to ${k.show(m.kHigh)}` : '–'),
          },
          { head: 'Ss', unit: ss.unit, optional: true, cell: (m) => ss.show(m.specificStorage) },
          { head: 'Sy', optional: true, cell: (m) => formatNumber(m.specificYield) },
          { head: 'Porosity', optional: true, cell: (m) => formatNumber(m.porosity) },
        ],
        content.materials,
      ),
    ),
    subsection(
      '2.2',
      'Zones',
      sourcedTable(
        '2.2',
        'Where each material lies; a later row replaces earlier ones',
        [
          { head: 'Zone', cell: (z) => z.name },
          { head: 'Material', words: true, cell: (z) => name.get(z.materialId) ?? 'deleted' },
          {
            head: 'Place',
            words: true,
            cell: (z) => (z.polygon ? `polygon of ${z.polygon.length} vertices` : 'everywhere'),
          },
          { head: 'Base level', unit: level.unit, cell: (z) => level.show(z.base, 2) },
          { head: 'Top level', unit: level.unit, optional: true, cell: (z) => level.show(z.top, 2) },
        ],
        content.zones,
      ),
    ),
    subsection(
      '2.3',
      'Named points',
      sourcedTable(
        '2.3',
        'Points where heads are wanted',
        [
          { head: 'Point', cell: (p) => p.name },
          { head: 'x', unit: level.unit, cell: (p) => formatNumber(p.x, 1) },
          { head: 'y', unit: level.unit, cell: (p) => formatNumber(p.y, 1) },
        ],
        content.points,
      ),
    ),
  )
}

// ---- 3 Water --------------------------------------------------------------------------------------------------

function waterSection(content: GatheredContent): Content[] {
  const rate = inUnit(content, 'rate')
  const speed = inUnit(content, 'conductivity')
  const level = inUnit(content, 'length')
  const flux = inUnit(content, 'line flux')
  const { length } = content.project.units
  const total = (kind: 'abstraction' | 'recharge') =>
    content.wells
      .filter((w) => w.kind === kind)
      .reduce((sum, w) => sum + convert(w.rate, shownUnit('rate', content.project.units)), 0)
  const levels = (all: readonly Quantity[] | null) => {
    const [first, last] = [all?.[0], all?.at(-1)]
    if (!all || all.length < 2) return level.show(first, 2)
    return `${level.show(first, 2)} to ${level.show(last, 2)}`
  }
  return section(
    3,
    'Water',
    subsection(
      '3.1',
      'Wells',
      sourcedTable(
        '3.1',
        `Wells as entered: abstraction ${formatNumber(total('abstraction'))} ${rate.unit}, recharge ${formatNumber(total('recharge'))} ${rate.unit} in total`,
        [
          { head: 'Well', cell: (w) => w.name },
          { head: 'Kind', words: true, cell: (w) => w.kind },
          { head: 'x', unit: length, cell: (w) => formatNumber(w.x, 1) },
          { head: 'y', unit: length, cell: (w) => formatNumber(w.y, 1) },
          { head: 'Rate', unit: rate.unit, cell: (w) => rate.show(w.rate) },
          { head: 'Radius', unit: length, optional: true, cell: (w) => level.show(w.radius, 2) },
          { head: 'Lowest level', unit: length, optional: true, cell: (w) => level.show(w.lowestLevel, 2) },
          {
            head: 'Screen',
            unit: length,
            optional: true,
            cell: (w) =>
              w.screenTop ? `${level.show(w.screenTop, 2)} to ${level.show(w.screenBottom, 2)}` : '–',
          },
        ],
        content.wells,
      ),
    ),
    subsection(
      '3.2',
      'Recharge zones',
      sourcedTable(
        '3.2',
        'Recharge; zones add up where they overlap',
        [
          { head: 'Zone', cell: (r) => r.name },
          { head: 'Rate', unit: speed.unit, cell: (r) => speed.show(r.rate) },
          {
            head: 'Area',
            unit: `${length}²`,
            cell: (r) =>
              r.polygon ? formatNumber(Math.abs(signedArea(r.polygon as Vertex[])), 0) : 'everywhere',
          },
        ],
        content.rechargeZones,
      ),
    ),
    subsection(
      '3.3',
      'Boundaries',
      sourcedTable(
        '3.3',
        'Boundaries; every edge without one is a no-flow edge',
        [
          { head: 'Boundary', cell: (b) => b.name },
          { head: 'Kind', words: true, cell: (b) => b.kind },
          { head: 'Length', unit: length, cell: (b) => formatNumber(lineLength(b.line as Vertex[]), 0) },
          { head: 'Level', unit: length, optional: true, cell: (b) => levels(b.levels) },
          {
            head: 'Flux',
            unit: flux.unit,
            optional: true,
            cell: (b) => (b.flux ? `${flux.show(b.flux)} ${b.direction}` : '–'),
          },
          {
            head: 'Conductance α',
            unit: speed.unit,
            optional: true,
            cell: (b) => speed.show(b.conductance),
          },
          {
            head: 'Parts below',
            unit: length,
            optional: true,
            cell: (b) => level.show(b.disconnectsBelow, 2),
          },
        ],
        content.boundaries,
      ),
    ),
    subsection(
      '3.4',
      'Cut-off walls',
      sourcedTable(
        '3.4',
        'Cut-off walls; in plan each acts over the whole saturated thickness',
        [
          { head: 'Wall', cell: (w) => w.name },
          { head: 'Length', unit: length, cell: (w) => formatNumber(lineLength(w.line as Vertex[]), 1) },
          { head: 'Thickness', unit: length, cell: (w) => level.show(w.thickness, 2) },
          {
            head: 'K',
            unit: speed.unit,
            cell: (w) => (w.k.value === 0 ? 'impermeable' : speed.show(w.k)),
          },
          { head: 'Toe level', unit: length, optional: true, cell: (w) => level.show(w.toe, 2) },
        ],
        content.walls,
      ),
    ),
    subsection('3.5', 'Coordinates of lines and polygons', coordinatesTable(content)),
  )
}

/** A row of the table of coordinates holds so many vertices; longer features go on in the next row. */
const verticesPerRow = 12

function coordinatesTable(content: GatheredContent): Piece {
  const { length } = content.project.units
  const level = inUnit(content, 'length')
  const pair = ([x, y]: readonly number[]) => `(${formatNumber(x, 1)}, ${formatNumber(y, 1)})`
  const along = (line: readonly (readonly number[])[], levels: readonly Quantity[] | null) =>
    line.map((vertex, index) =>
      levels && levels.length > 1 ? `${pair(vertex)} at ${level.show(levels[index], 2)}` : pair(vertex),
    )
  const features = [
    ...content.zones.map((z) => ({ name: z.name, kind: 'zone', vertices: along(z.polygon ?? [], null) })),
    ...content.rechargeZones.map((r) => ({
      name: r.name,
      kind: 'recharge zone',
      vertices: along(r.polygon ?? [], null),
    })),
    ...content.boundaries.map((b) => ({ name: b.name, kind: b.kind, vertices: along(b.line, b.levels) })),
    ...content.walls.map((w) => ({ name: w.name, kind: 'cut-off wall', vertices: along(w.line, null) })),
  ]
  const rows = features.flatMap(({ name, kind, vertices }) =>
    Array.from({ length: Math.ceil(vertices.length / verticesPerRow) }, (_, row) => ({
      name: row === 0 ? name : `${name}, continued`,
      kind,
      vertices: vertices.slice(row * verticesPerRow, (row + 1) * verticesPerRow).join('; '),
    })),
  )
  return table(
    '3.5',
    `Vertices (x, y) in order, ${length}, with the level at the vertex where it varies along the line`,
    [
      { head: 'Feature', cell: (f) => f.name },
      { head: 'Kind', words: true, cell: (f) => f.kind },
      { head: 'Vertices', words: true, cell: (f) => f.vertices },
    ],
    rows,
  )
}

// ---- 4 Cases --------------------------------------------------------------------------------------------------

function casesSection(content: GatheredContent): Content[] {
  const { run, against } = content
  const { model, result } = run
  const { length } = content.project.units
  const span = ([from, to]: readonly [number, number]) => `${formatNumber(from, 1)} to ${formatNumber(to, 1)}`
  return section(
    4,
    'Cases',
    subsection(
      '4.1',
      'The case of record',
      facts([
        ['Case', run.caseName],
        ['Kind', `${model.kind}, ${model.flow}, ${model.time.kind}`],
        ...(result.times.length > 0
          ? [
              [
                'Time of the results',
                `the end of its stages, ${formatNumber(result.times[0])} ${content.project.units.time}; earlier times are in the result of the run`,
              ] as const,
            ]
          : []),
        ['Extent', `x ${span(model.extent.x)} ${length}, y ${span(model.extent.y)} ${length}`],
        [
          'Grid',
          `${result.grid.columns} columns × ${result.grid.rows} rows, ${formatNumber(result.grid.active, 0)} of ${formatNumber(result.grid.cells, 0)} cells active`,
        ],
        [
          'No-flow edges',
          result.noFlowEdges.length > 0 ? result.noFlowEdges.join(', ') : 'none: every edge has a boundary',
        ],
        ...(against
          ? [
              [
                'Compared with',
                `run ${against.number}, case ${against.caseName}, model file ${against.inputSha256}`,
              ] as const,
            ]
          : []),
      ]),
    ),
    subsection(
      '4.2',
      'Solver record',
      facts([
        [
          'Run',
          `${run.number}, by ${run.by}, ${localTime(content, run.startedAt)} to ${localTime(content, run.endedAt)}`,
        ],
        ['Engine', `Lavant engine ${result.engine}`],
        ['Method', `${methodWords[result.method]}; ${kernelsInWords(result.kernels)}`],
        ['Outcome', result.converged ? 'converged' : 'DID NOT CONVERGE: not to be used'],
        [
          result.method === 'sor' ? 'Sweeps' : 'Iterations',
          `${formatNumber(result.iterations, 0)}${result.steps === undefined ? '' : `, over ${formatNumber(result.steps, 0)} steps in time`}`,
        ],
        [
          'Residual',
          `${formatNumber(result.residual)} of the right-hand side; tolerance ${formatNumber(run.model.solver?.tolerance ?? defaultTolerance)}`,
        ],
        ['Model file (SHA-256)', run.inputSha256],
        ['Head field (SHA-256)', run.headsSha256],
      ]),
      warningsTable(content),
    ),
  )
}

/** Warnings of the run, and of the one it is compared with, each with who accepted it and why where that is needed. */
function warningsTable(content: GatheredContent): Piece {
  const { run, against } = content
  const rows = [run, ...(against ? [against] : [])].flatMap(({ number, result, acceptances }) =>
    byGravity(result.warnings).map((warning) => ({
      run: number,
      severity: severityWords[warning.severity],
      text: warning.text,
      acceptance: acceptanceOf(warning, acceptances ?? []),
      open: warning.accept === true,
    })),
  )
  if (rows.length === 0) return text(against ? 'The runs gave no warning.' : 'The run gave no warning.')
  return table(
    '4.1',
    against ? 'Warnings of the runs' : 'Warnings of the run',
    [
      ...(against ? [{ head: 'Run', cell: (w: (typeof rows)[number]) => String(w.run) }] : []),
      { head: 'Severity', words: true, cell: (w) => w.severity },
      { head: 'Warning', words: true, cell: (w) => w.text },
      {
        head: 'Accepted',
        words: true,
        optional: true,
        cell: (w) =>
          w.acceptance
            ? acceptanceInWords(w.acceptance, (iso) => localDay(content, iso))
            : w.open
              ? 'by nobody yet: not for issue'
              : '–',
      },
    ],
    rows,
  )
}

// ---- 5 Heads --------------------------------------------------------------------------------------------------

function headsSection({ content, heads, againstHeads }: DrawRequest): Content[] {
  const { run, against, project } = content
  const { result } = run
  const field = decodedField(heads)
  const { length } = project.units
  const drawdown = against && againstHeads ? drawdownFigure(content, field, decodedField(againstHeads)) : null
  return section(
    5,
    'Heads',
    subsection(
      '5.1',
      'Plan of heads',
      ...(result.converged
        ? []
        : [
            text({
              text: 'This run did not converge. Its heads are not a result.',
              color: alarm,
              bold: true,
            }),
          ]),
      figure(
        '5.1',
        headsFigure(content, field),
        `Heads, ${levelUnit(length, project.verticalDatum)}; case ${run.caseName}${momentInWords(result, project.units.time)}, run ${run.number}, ${localDay(content, run.endedAt)}. `,
      ),
    ),
    subsection(
      '5.2',
      'Heads at named points',
      pointsTable(content),
      ...(result.verification ? [text(bandMeaning)] : []),
    ),
    subsection('5.3', 'Water balance', balanceTable(content)),
    subsection('5.4', 'Wells', wellsTable(content)),
    ...(drawdown && against
      ? [
          subsection(
            '5.5',
            'Drawdown',
            figure(
              '5.2',
              drawdown,
              `Drawdown Δh in ${length} of run ${run.number} (${run.caseName}) against run ${against.number} (${against.caseName}). `,
            ),
          ),
        ]
      : []),
    caution(
      'Drawdown bears on safety and on neighbours. The method leaves out vertical flow within the aquifer, ground finer than section 2 and change with time. ' +
        'Well losses are not in the head at the well face. The figures are not a substitute for the judgement of a qualified engineer; local codes and licensed practice govern.',
    ).content,
  )
}

/** The field as figures want it: edges and heads. */
function decodedField(buffer: Uint8Array): HeadField {
  const { grid, heads } = decodeHeads(buffer)
  return { xEdges: grid.xEdges, yEdges: grid.yEdges, heads }
}

function pointsTable({ run, against, project }: GatheredContent): Piece {
  const { length } = project.units
  const before = new Map(against?.result.points.map((p) => [p.name, p.head[0] ?? null]))
  const rows = run.result.points.map((point) => {
    const now = point.head[0] ?? null
    const other = before.get(point.name) ?? null
    return {
      name: point.name,
      head: now,
      other,
      drawdown: now === null || other === null ? null : other - now,
      why: point.why ?? '',
      band: bandInWords(point.band?.[0]),
    }
  })
  return table(
    '5.1',
    against
      ? `Heads at named points, ${levelUnit(length, project.verticalDatum)}, and drawdown against run ${against.number}`
      : `Heads at named points, ${levelUnit(length, project.verticalDatum)}`,
    [
      { head: 'Point', cell: (p) => p.name },
      { head: 'Head', unit: length, cell: (p) => formatNumber(p.head, 3) },
      { head: 'Error band', unit: length, optional: true, cell: (p) => p.band },
      ...(against
        ? [
            {
              head: `Run ${against.number}`,
              unit: length,
              cell: (p: (typeof rows)[number]) => formatNumber(p.other, 3),
            },
            {
              head: 'Drawdown Δh',
              unit: length,
              cell: (p: (typeof rows)[number]) => formatNumber(p.drawdown, 3),
            },
          ]
        : []),
      { head: 'Note', words: true, optional: true, cell: (p) => p.why },
    ],
    rows,
  )
}

function wellsTable({ run, project }: GatheredContent): Piece {
  const { length } = project.units
  const rate = unitLabel(shownUnit('rate', project.units))
  return table(
    '5.3',
    'Rates and levels of the wells',
    [
      { head: 'Well', cell: (w) => w.name },
      { head: 'Rate requested', unit: rate, cell: (w) => formatNumber(w.requested[0] ?? null) },
      { head: 'Rate achieved', unit: rate, cell: (w) => formatNumber(w.achieved[0] ?? null) },
      { head: 'Head in the cell', unit: length, cell: (w) => formatNumber(w.cellHead[0] ?? null, 2) },
      { head: 'Head at the well face', unit: length, cell: (w) => formatNumber(w.wellHead[0] ?? null, 2) },
      { head: 'Error band', unit: length, optional: true, cell: (w) => bandInWords(w.band?.[0], 2) },
    ],
    run.result.wells,
  )
}

function balanceTable(content: GatheredContent): Piece {
  const { result } = content.run
  const rate = unitLabel(shownUnit('rate', content.project.units))
  const wells = result.balance.kinds.find((kind) => kind.kind === 'wells')
  const kindOf = new Map<string, string>(content.boundaries.map((boundary) => [boundary.name, boundary.kind]))
  const parts = [
    ...result.boundaries.map((part) => ({ ...part, kind: kindOf.get(part.name) ?? 'boundary' })),
    ...result.recharge.map((part) => ({ ...part, kind: 'recharge' })),
    ...result.leakage.map((part) => ({ ...part, kind: 'leakage' })),
    ...(wells ? [{ ...wells, name: 'All wells', kind: 'wells' }] : []),
    ...storageFlow(result).map((part) => ({ ...part, kind: 'ground' })),
    { ...totalFlow(result), kind: '' },
  ]
  return table(
    '5.2',
    `Water balance; error ${formatNumber(result.balance.errorPercent[0])} % of the inflow`,
    [
      { head: 'Part', cell: (part) => part.name },
      { head: 'Kind', words: true, cell: (part) => part.kind },
      { head: 'Inflow', unit: rate, cell: (part) => formatNumber(part.inflow[0] ?? null, 2) },
      { head: 'Outflow', unit: rate, cell: (part) => formatNumber(part.outflow[0] ?? null, 2) },
    ],
    parts,
  )
}

// ---- 6 Readings -----------------------------------------------------------------------------------------------

function readingsSection(content: GatheredContent): Content[] {
  const { units, verticalDatum } = content.project
  const level = inUnit(content, 'length')
  return section(
    6,
    'Readings',
    subsection(
      '6.1',
      'Instruments',
      table(
        '6.1',
        `Instruments and last heads, ${levelUnit(units.length, verticalDatum)}`,
        [
          { head: 'Instrument', cell: (i) => (i.outOfService ? `${i.name} (out of service)` : i.name) },
          { head: 'Kind', words: true, cell: (i) => i.kind },
          {
            head: 'Response zone',
            unit: units.length,
            optional: true,
            cell: (i) =>
              i.responseTop ? `${level.show(i.responseTop, 1)} to ${level.show(i.responseBase, 1)}` : '–',
          },
          { head: 'Readings', cell: (i) => formatNumber(i.readings, 0) },
          { head: 'From', cell: (i) => localDay(content, i.first) },
          { head: 'To', cell: (i) => localDay(content, i.last) },
          { head: 'Last head', unit: units.length, cell: (i) => formatNumber(i.lastHead, 2) },
        ],
        content.instruments,
      ),
    ),
    subsection(
      '6.2',
      'Reference levels',
      table(
        '6.2',
        'History of reference levels',
        [
          { head: 'Instrument', cell: (r) => r.instrument },
          { head: 'From', words: true, cell: (r) => localTime(content, r.from) },
          { head: 'Level', unit: units.length, cell: (r) => level.show(r.level, 3) },
          { head: 'Levelled', words: true, cell: (r) => r.levelled },
          { head: 'Reason', words: true, cell: (r) => r.reason },
        ],
        content.instruments.flatMap((i) => i.referenceLevels.map((r) => ({ ...r, instrument: i.name }))),
      ),
    ),
    subsection(
      '6.3',
      'Imported files',
      table(
        '6.3',
        'Files as they came, with the beginning of their SHA-256',
        [
          { head: 'File', cell: (f) => f.file },
          { head: 'Rows', cell: (f) => formatNumber(f.rows, 0) },
          { head: 'Added', cell: (f) => formatNumber(f.added, 0) },
          { head: 'Imported', words: true, cell: (f) => `${localDay(content, f.committedAt)}, ${f.by}` },
          { head: 'SHA-256', words: true, cell: (f) => `${f.sha256.slice(0, 16)}…` },
        ],
        content.imports,
      ),
    ),
  )
}

// ---- 7 Fit ----------------------------------------------------------------------------------------------------

function fitSection({ content, heads }: DrawRequest): Content[] {
  const { lines, statistics, date } = content.fit
  const { length } = content.project.units
  if (lines.length === 0) {
    return section(7, 'Fit', text({ text: 'No readings were compared with this run.', color: grey }).content)
  }
  const oneToOne = oneToOneFigure(content)
  const plan = residualFigure(content, decodedField(heads))
  return section(
    7,
    'Fit',
    subsection(
      '7.1',
      'Measured and modelled heads',
      text(
        `Run ${content.run.number} against readings of ${localDay(content, date)}. Residual = measured − modelled: above zero where the modelled head is too low.`,
      ),
      table(
        '7.1',
        'Residuals',
        [
          { head: 'Instrument', cell: (l) => l.name },
          { head: 'Read', words: true, cell: (l) => localTime(content, l.at) },
          { head: 'Measured', unit: length, cell: (l) => formatNumber(l.measured, 3) },
          { head: 'Modelled', unit: length, cell: (l) => formatNumber(l.modelled, 3) },
          {
            head: 'Residual',
            unit: length,
            cell: (l) => formatSigned(l.residual, 3),
          },
          { head: 'Note', words: true, optional: true, cell: (l) => l.why ?? '' },
        ],
        lines,
      ),
      statistics
        ? table(
            '7.2',
            'Statistics of the residuals; scaled RMSE is RMSE over the range of the measured heads',
            [
              { head: 'Comparisons n', cell: (s) => `${s.n} of ${lines.length}` },
              { head: 'Bias (mean)', unit: length, cell: (s) => formatSigned(s.bias, 2) },
              { head: 'MAE', unit: length, cell: (s) => formatNumber(s.mae, 3) },
              { head: 'RMSE', unit: length, cell: (s) => formatNumber(s.rmse, 3) },
              {
                head: 'Scaled RMSE',
                unit: '%',
                cell: (s) => (s.scaledRmse === null ? '–' : formatNumber(100 * s.scaledRmse, 1)),
              },
              { head: 'Largest', unit: length, cell: (s) => formatSigned(s.largest, 2) },
            ],
            [statistics],
          )
        : text({ text: 'No instrument had both a measured and a modelled head.', color: alarm }),
    ),
    ...(oneToOne ? [subsection('7.2', 'Modelled against measured', figure('7.1', oneToOne, '', 0.7))] : []),
    ...(plan
      ? [
          subsection(
            '7.3',
            'Residuals on the plan',
            figure('7.2', plan, `Residuals in ${length} at their instruments, over the heads. `),
          ),
        ]
      : []),
  )
}

// ---- 8 Checks -------------------------------------------------------------------------------------------------

function checksSection(content: GatheredContent): Content[] {
  return section(
    8,
    'Checks',
    subsection(
      '8.1',
      'Independent estimates',
      sourcedTable(
        '8.1',
        'Estimates by hand or formula beside the computed figure',
        [
          { head: 'Result', cell: (e) => e.result },
          {
            head: 'Method',
            words: true,
            cell: (e) => [e.method, e.working].filter(Boolean).join(': '),
          },
          { head: 'Estimate', cell: (e) => `${formatNumber(e.value)} ${e.unit}` },
          {
            head: 'Computed',
            cell: (e) => (e.computed === null ? '–' : `${formatNumber(e.computed)} ${e.unit}`),
          },
          {
            head: 'Ratio',
            cell: (e) => (e.computed === null || e.value === 0 ? '–' : formatNumber(e.computed / e.value, 2)),
          },
        ],
        content.estimates,
      ),
    ),
    subsection('8.2', 'What the run says of itself', selfCheckTable(content)),
    subsection(
      '8.3',
      'Uplift, heave and exit gradient',
      caution(
        'Uplift, heave and exit gradients are not computed in plan: they need a vertical section and a check of their own, by a qualified engineer, under the local code. ' +
          'Nothing in this section says that the works comply with a standard.',
      ),
    ),
  )
}

function selfCheckTable({ run, project }: GatheredContent): Piece {
  const { result, model } = run
  const rate = unitLabel(shownUnit('rate', project.units))
  const tolerance = model.solver?.tolerance
  const sum = (values: readonly (number[] | undefined)[]) =>
    values.reduce((total, value) => total + (value?.[0] ?? 0), 0)
  const rows: [what: string, found: string, against: string][] = [
    ['Outcome', result.converged ? 'converged' : 'did not converge', 'converged'],
    [
      'Residual relative to the right-hand side',
      formatNumber(result.residual),
      tolerance === undefined ? 'as the engine sets it' : `≤ ${formatNumber(tolerance)}`,
    ],
    [
      'Error left in a head by stopping here',
      `${formatNumber(result.headError)} ${project.units.length}`,
      'estimated from the convergence seen',
    ],
    [
      'Inflow and outflow',
      `${formatNumber(result.balance.inflow[0], 2)} and ${formatNumber(result.balance.outflow[0], 2)} ${rate}`,
      'equal',
    ],
    [
      'Water-balance error',
      `${formatNumber(result.balance.errorPercent[0])} %`,
      `≤ ${formatNumber(mostBalanceError)} %`,
    ],
    [
      'Rates of the wells achieved',
      `${formatNumber(sum(result.wells.map((well) => well.achieved)))} ${rate}`,
      `${formatNumber(sum(result.wells.map((well) => well.requested)))} ${rate} requested`,
    ],
    ...verificationLines(result, project.units.length),
  ]
  return table(
    '8.2',
    `Run ${run.number} held against what is asked of a run`,
    [
      { head: 'Check', cell: ([what]) => what },
      { head: 'Found', words: true, cell: ([, found]) => found },
      { head: 'Held against', words: true, cell: ([, , against]) => against },
    ],
    rows,
  )
}

// ---- 9 Package ------------------------------------------------------------------------------------------------

function packageSection(content: GatheredContent, cover: GatheredCover): Content[] {
  const title = new Map(sections.map((s) => [s.key, `${s.number} ${s.title}`]))
  return section(
    9,
    'Package',
    subsection(
      '9.1',
      'Conclusions',
      content.basis?.conclusions
        ? text(content.basis.conclusions)
        : text({ text: 'No conclusion has been written in section 1.', color: alarm }),
    ),
    subsection('9.2', 'Limitations and cautions', bullets(limitations(content))),
    subsection(
      '9.3',
      'Checking',
      table(
        '9.1',
        'Sections of the book when this document was drawn',
        [
          { head: 'Section', cell: (s) => title.get(s.key) ?? s.key },
          { head: 'State', words: true, cell: (s) => s.state },
          { head: 'Checked by', words: true, cell: (s) => s.checkedBy ?? '–' },
          { head: 'On', words: true, cell: (s) => localDay(content, s.checkedAt) },
        ],
        cover.sections,
      ),
    ),
    // The record closes the document under the revisions, not on a page of its own.
    keptWhole(
      cover.revisions.length < 12,
      subsection(
        '9.4',
        'Revisions',
        table(
          '9.2',
          'Revision history',
          [
            { head: 'Revision', cell: (r) => r.revision },
            { head: 'Status', words: true, cell: (r) => r.status },
            { head: 'Reason', words: true, cell: (r) => r.reason },
            { head: 'Issued', words: true, cell: (r) => localDay(content, r.issuedAt) },
          ],
          cover.revisions,
        ),
      ),
      subsection(
        '9.5',
        'Record',
        facts([
          ['Input hash (SHA-256)', cover.inputSha256],
          ['Model file (SHA-256)', content.run.inputSha256],
          ['Head field (SHA-256)', content.run.headsSha256],
          ['Engine', `Lavant engine ${content.run.result.engine}`],
          ['Kept at', cover.address],
        ]),
      ),
    ),
  )
}

function limitations(content: GatheredContent): string[] {
  const sourced = [
    ...content.assumptions,
    ...content.materials,
    ...content.zones,
    ...content.points,
    ...content.wells,
    ...content.rechargeZones,
    ...content.boundaries,
    ...content.walls,
    ...content.estimates,
  ]
  const unsourced = sourced.filter((row) => row.source === '').length
  const compared = content.fit.statistics?.n ?? 0
  return [
    'Steady flow in plan: heads do not vary with depth, and change with time is left out.',
    'A wall and a well act over the whole saturated thickness. Flow under the toe of a hanging wall needs a vertical section.',
    'Ground between boreholes is as section 2 states it; no allowance is made for ground that nobody has seen.',
    'An edge without a boundary carries no flow. Where an outer boundary stands for distance, results near it depend on it.',
    'Well losses, clogging, and the order of construction are left out.',
    'The unsaturated zone, density and temperature are left out.',
    ...(compared === 0 ? ['The heads have not been held against any reading.'] : []),
    ...(unsourced > 0
      ? [`Of ${sourced.length} input rows, ${unsourced} have no source: they are marked "${notStated}".`]
      : []),
    ...(content.basis?.notFor ? [`Not for: ${content.basis.notFor}`] : []),
  ]
}
