import { createRequire } from 'node:module'
import { dirname, join } from 'node:path'
import { DateTime } from 'luxon'
import pdfmake from 'pdfmake'
import type { Content, ContentTable, TableCell, TDocumentDefinitions } from 'pdfmake/interfaces'
import { lineLength, signedArea, type Vertex } from '~/book/field'
import { sections } from '~/book/sections'
import type { HeadField } from '~/heads/field'
import { decodeHeads } from '~/solver/heads-buffer'
import { convert, type Dimension, formatNumber, type Quantity, shownUnit, unitLabel } from '~/units'
import { type DrawnFigure, drawdownFigure, headsFigure, oneToOneFigure, residualFigure } from './figures'
import type { DrawRequest, GatheredContent, GatheredCover, GatheredRun } from './gathered'
import { statusMeaning } from './package'

const ink = '#14191d'
const grey = '#4a5258'
const rule = '#c9c9c2'
const paper = '#f4f3ee'
const alarm = '#96301f'

/** Text width of an A4 page with these margins, in points. */
const textWidth = 595.28 - 62 - 48

const fontFolder = join(dirname(createRequire(import.meta.url).resolve('source-sans/package.json')), 'TTF')

/** Registers the one typeface and shuts every other door: a package draws from what it is given, nothing else. */
function setUpPdfmake(): void {
  pdfmake.setFonts({
    'Source Sans 3': {
      normal: join(fontFolder, 'SourceSans3-Regular.ttf'),
      bold: join(fontFolder, 'SourceSans3-Semibold.ttf'),
      italics: join(fontFolder, 'SourceSans3-It.ttf'),
      bolditalics: join(fontFolder, 'SourceSans3-SemiboldIt.ttf'),
    },
  })
  pdfmake.setUrlAccessPolicy(() => false)
  pdfmake.setLocalAccessPolicy((path) => path.startsWith(fontFolder))
}

/**
 * Draws a calculation package as an A4 PDF. The same request gives the same bytes: dates come from the request, not
 * from the clock. Throws when a figure or the document cannot be drawn.
 */
export async function drawPackage(request: DrawRequest): Promise<Buffer> {
  setUpPdfmake()
  return pdfmake.createPdf(packageDocument(request)).getBuffer()
}

/** The document as pdfmake's definition: a plain function of the request. */
export function packageDocument(request: DrawRequest): TDocumentDefinitions {
  const { content, cover } = request
  const reference = `${content.project.calcReference} ${cover.revision}`
  const final = cover.status === 'issued'
  const when = new Date(cover.issuedAt ?? cover.madeAt)
  return {
    pageSize: 'A4',
    pageMargins: [62, 62, 48, 58],
    defaultStyle: { font: 'Source Sans 3', fontSize: 9.5, lineHeight: 1.18, color: ink },
    language: 'en-GB',
    info: {
      title: `${content.project.title}: ${reference}`,
      author: cover.madeBy,
      subject: `Calculation package ${reference}, ${cover.status}`,
      creator: 'Lavant',
      producer: 'Lavant',
      creationDate: when,
      modDate: when,
    },
    watermark: final
      ? undefined
      : {
          text: cover.status === 'draft' ? 'DRAFT' : cover.status.toUpperCase(),
          color: alarm,
          opacity: 0.07,
          bold: true,
          angle: 52,
        },
    header: (page) =>
      page === 1
        ? null
        : {
            margin: [62, 26, 48, 0],
            columns: [
              { text: content.project.title, color: grey, fontSize: 8.5 },
              {
                text: `${reference}   ${final ? '' : cover.status.toUpperCase()}`.trim(),
                alignment: 'right',
                fontSize: 8.5,
                color: final ? grey : alarm,
              },
            ],
          },
    footer: (page, pages) => ({
      margin: [62, 16, 48, 0],
      columns: [
        { text: `${content.project.number} · ${content.project.client}`, color: grey, fontSize: 8.5 },
        { text: `${reference} · page ${page} of ${pages}`, alignment: 'right', color: grey, fontSize: 8.5 },
      ],
    }),
    // A heading never stands alone at the foot of a page.
    pageBreakBefore: (node, nodes) => node.headlineLevel === 2 && nodes.getFollowingNodesOnPage().length < 3,
    styles: {
      section: { fontSize: 17, bold: true, margin: [0, 0, 0, 8] },
      sub: { fontSize: 11.5, bold: true, margin: [0, 12, 0, 4] },
      caption: { fontSize: 8.5, color: grey, margin: [0, 3, 0, 10] },
      small: { fontSize: 8.5, color: grey },
      head: { bold: true, fontSize: 8.5 },
    },
    content: [
      ...coverPage(content, cover),
      contentsPage(),
      ...basisSection(content),
      ...groundSection(content),
      ...waterSection(content),
      ...casesSection(content),
      ...headsSection(request),
      ...readingsSection(content),
      ...fitSection(request),
      ...checksSection(content),
      ...packageSection(content, cover),
    ],
  }
}

// ---- pieces -------------------------------------------------------------------------------------------------

function sectionTitle(number: number, title: string): Content {
  return {
    text: `${number}   ${title}`,
    style: 'section',
    pageBreak: 'before',
    tocItem: true,
    tocStyle: { bold: true },
    tocMargin: [0, 2, 0, 0],
    outline: true,
    id: `section-${number}`,
  } as Content
}

function sub(no: string, title: string): Content {
  return {
    text: `${no}   ${title}`,
    style: 'sub',
    tocItem: true,
    tocMargin: [14, -1.5, 0, 0],
    headlineLevel: 2,
    outline: true,
    outlineParentId: `section-${no.split('.')[0]}`,
  } as Content
}

const tableLayout = {
  hLineWidth: (i: number, node: ContentTable) =>
    i === 0 || i === 1 || i === node.table.body.length ? 0.7 : 0.4,
  hLineColor: (i: number, node: ContentTable) =>
    i === 0 || i === 1 || i === node.table.body.length ? grey : rule,
  vLineWidth: () => 0,
  paddingLeft: (i: number) => (i === 0 ? 2 : 5),
  paddingRight: () => 3,
  paddingTop: () => 2.5,
  paddingBottom: () => 2.5,
  fillColor: (row: number) => (row === 0 ? paper : null),
}

interface TableColumn<Row> {
  head: string
  unit?: string
  width?: string | number
  words?: boolean
  cell: (row: Row) => string
}

/**
 * A table whose rows carry sources. Where rows share sources, each gets the number of its source, listed once below
 * the table; where nearly every row has its own, the source stands in the row.
 */
function sourcedTable<Row extends { source: string }>(
  no: string,
  caption: string,
  columns: TableColumn<Row>[],
  rows: readonly Row[],
): Content {
  const sources = [...new Set(rows.map((row) => row.source).filter(Boolean))]
  if (sources.length > 3 && sources.length > rows.length / 2) {
    const own = { head: 'Source', words: true, width: '*', cell: (row: Row) => row.source || 'not stated' }
    return table(no, caption, [...columns, own], rows)
  }
  const mark = (row: Row) => (row.source ? `[${sources.indexOf(row.source) + 1}]` : 'not stated')
  return {
    stack: [
      table(no, caption, [...columns, { head: 'Source', words: true, width: '*', cell: mark }], rows),
      ...sources.map(
        (source, index): Content => ({
          columns: [
            { text: `[${index + 1}]`, width: 20 },
            { text: source, width: '*' },
          ],
          fontSize: 8.5,
          color: grey,
          margin: [2, 0, 0, index === sources.length - 1 ? 8 : 1],
        }),
      ),
    ],
  }
}

function table<Row>(no: string, caption: string, columns: TableColumn<Row>[], rows: readonly Row[]): Content {
  if (rows.length === 0) return { text: `${caption}: none.`, color: grey, margin: [0, 2, 0, 6] }
  const align = (column: TableColumn<Row>, index: number) => (column.words || index === 0 ? 'left' : 'right')
  const head: TableCell[] = columns.map((column, index) => ({
    text: [{ text: column.head, bold: true }, column.unit ? { text: ` ${column.unit}`, color: grey } : ''],
    fontSize: 8.5,
    alignment: align(column, index),
  }))
  const body: TableCell[][] = rows.map((row) =>
    columns.map((column, index) => ({
      text: column.cell(row),
      fontSize: 8.8,
      bold: index === 0,
      alignment: align(column, index),
    })),
  )
  return {
    stack: [
      { text: `Table ${no}  ${caption}`, style: 'caption', margin: [0, 6, 0, 2], headlineLevel: 3 },
      {
        table: {
          headerRows: 1,
          dontBreakRows: true,
          keepWithHeaderRows: 1,
          widths: columns.map((column) => column.width ?? 'auto'),
          body: [head, ...body],
        },
        layout: tableLayout,
        margin: [0, 0, 0, 8],
      },
    ],
  }
}

function facts(rows: [string, string][]): Content {
  return {
    table: {
      widths: [150, '*'],
      body: rows.map(([label, value]) => [{ text: label, color: grey }, { text: value || '–' }]),
    },
    layout: { ...tableLayout, fillColor: () => null, hLineWidth: () => 0.4, hLineColor: () => rule },
    margin: [0, 2, 0, 8],
  }
}

/** A heading and the figure below it, never parted by a page. */
function headed(heading: Content, body: Content): Content {
  return { stack: [heading, body], unbreakable: true }
}

function figure(no: string, { svg, ratio, caption }: DrawnFigure, lead: string, share = 1): Content {
  const width = textWidth * share
  return {
    stack: [
      { svg, width, height: width * ratio },
      { text: [{ text: `Fig. ${no}  `, bold: true, color: ink }, lead, caption], style: 'caption' },
    ],
    unbreakable: true,
  }
}

function caution(text: string): Content {
  return {
    table: { widths: ['*'], body: [[{ text, fontSize: 8.8, color: grey }]] },
    layout: {
      hLineWidth: () => 0,
      vLineWidth: (i: number) => (i === 0 ? 2 : 0),
      vLineColor: () => '#9a6a14',
      paddingLeft: () => 8,
      paddingTop: () => 1,
      paddingBottom: () => 1,
    },
    margin: [0, 8, 0, 8],
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

function localTime(content: GatheredContent, iso: string | null): string {
  if (!iso) return '–'
  return DateTime.fromISO(iso, { zone: content.project.timeZone })
    .setLocale('en-GB')
    .toFormat('d LLL yyyy HH:mm')
}

function localDay(content: GatheredContent, iso: string | null): string {
  if (!iso) return '–'
  return DateTime.fromISO(iso, { zone: content.project.timeZone }).setLocale('en-GB').toFormat('d LLL yyyy')
}

function paragraph(label: string, text: string | undefined): Content[] {
  return text ? [{ text: [{ text: `${label}. `, bold: true }, text], margin: [0, 0, 0, 6] }] : []
}

// ---- cover and contents ---------------------------------------------------------------------------------------

function coverPage(content: GatheredContent, cover: GatheredCover): Content[] {
  const { project } = content
  const signature = (role: 'originator' | 'checker' | 'approver') =>
    cover.signatures.find((s) => s.role === role)
  const signed = (role: 'originator' | 'checker' | 'approver', label: string): TableCell[] => {
    const found = signature(role)
    return [
      { text: label, color: grey },
      { text: found?.name ?? 'not signed', bold: Boolean(found), color: found ? ink : grey },
      { text: found ? localTime(content, found.at) : '–', alignment: 'right' },
    ]
  }
  return [
    {
      text: 'CALCULATION PACKAGE',
      fontSize: 9.5,
      characterSpacing: 1.4,
      color: grey,
      margin: [0, 28, 0, 26],
    },
    { text: project.title, fontSize: 28, bold: true, lineHeight: 1.05, margin: [0, 0, 0, 6] },
    { text: project.client, fontSize: 13, color: grey, margin: [0, 0, 0, 30] },
    facts([
      ['Project number', project.number],
      ['Calculation reference', project.calcReference],
      ['Revision', `${cover.revision}: ${cover.reason}`],
      ['Status', `${cover.status}: ${statusMeaning[cover.status]}`],
      ['Issued for', cover.purpose],
      ['Date', localDay(content, cover.issuedAt ?? cover.madeAt)],
      [
        'Supersedes',
        cover.revisions.find((r) => r.revision !== cover.revision && r.issuedAt)?.revision ?? 'nothing',
      ],
      ['Distribution', cover.distribution || 'as the project manager decides'],
    ]),
    { text: 'Sign-off', style: 'sub' },
    {
      table: {
        widths: [110, '*', 130],
        body: [
          [
            { text: 'Role', style: 'head' },
            { text: 'Name', style: 'head' },
            { text: 'Signed', style: 'head', alignment: 'right' },
          ],
          signed('originator', 'Originator'),
          signed('checker', 'Checker'),
          signed('approver', 'Approver'),
        ],
      },
      layout: tableLayout,
      margin: [0, 0, 0, 8],
    },
    {
      text: 'Each signature covers the input hash below. Checker and approver are not the originator.',
      style: 'small',
      margin: [0, 0, 0, 18],
    },
    facts([
      ['Input hash (SHA-256)', cover.inputSha256],
      [
        'Run of record',
        `run ${content.run.number}, engine ${content.run.result.engine}, model file ${content.run.inputSha256}`,
      ],
      ['Levels', `${project.units.length}, ${project.verticalDatum}`],
      ['Grid reference system', `EPSG:${project.crsEpsg}`],
      ['Times', project.timeZone],
    ]),
    caution(
      'This package answers the question in section 1, for the use stated there, under the assumptions and limitations that it lists. ' +
        'It does not replace the judgement of a qualified engineer. Local codes and licensed practice govern.',
    ),
  ]
}

function contentsPage(): Content {
  return {
    toc: {
      title: { text: 'Contents', style: 'section', pageBreak: 'before' },
      textStyle: { fontSize: 9 },
      numberStyle: { color: grey, fontSize: 9 },
    },
  }
}

// ---- sections -------------------------------------------------------------------------------------------------

function basisSection(content: GatheredContent): Content[] {
  const { basis, project } = content
  return [
    sectionTitle(1, 'Basis'),
    sub('1.1', 'Question and use'),
    ...(basis
      ? [
          ...paragraph('Question', basis.question),
          ...paragraph('Accuracy needed', basis.accuracy),
          ...paragraph('Intended use', basis.intendedUse),
          ...paragraph('Not for', basis.notFor),
        ]
      : [{ text: 'Section 1 of the book is empty.', color: alarm }]),
    sub('1.2', 'Idealisation and governing equation'),
    ...paragraph('Idealisation', basis?.idealisation),
    {
      text: [
        'Steady flow in plan:  ',
        { text: '∇·(T ∇h) + R − Σ Q = 0', bold: true },
        `,  with T = K × thickness (confined) or K × saturated thickness (unconfined), h the head, R recharge and Q abstraction. `,
        'Inflow to the model is positive. Over any closed line the flow through it equals what is recharged and pumped inside.',
      ],
      margin: [0, 0, 0, 6],
    },
    sub('1.3', 'Assumptions register'),
    table(
      '1.1',
      'Assumptions',
      [
        { head: 'No.', cell: (a) => a.reference },
        { head: 'Statement', words: true, width: '*', cell: (a) => a.statement },
        { head: 'Why', words: true, width: 130, cell: (a) => a.why || '–' },
        { head: 'Effect', words: true, width: 120, cell: (a) => a.effect || '–' },
      ],
      content.assumptions,
    ),
    sub('1.4', 'Standards and guides used'),
    table(
      '1.2',
      'Standards',
      [
        { head: 'Title', words: true, width: '*', cell: (s) => s.title },
        { head: 'Edition', words: true, cell: (s) => s.edition || '–' },
        { head: 'Status', words: true, cell: (s) => s.status },
        { head: 'Used for', words: true, width: 160, cell: (s) => s.use || '–' },
      ],
      content.standards,
    ),
    sub('1.5', 'Units and datums'),
    facts([
      ['Length and time', `${project.units.length}, ${project.units.time}`],
      ['Vertical datum', project.verticalDatum],
      ['Grid reference system', `EPSG:${project.crsEpsg}`],
      ['Time zone of the site', project.timeZone],
    ]),
  ]
}

function groundSection(content: GatheredContent): Content[] {
  const k = inUnit(content, 'conductivity')
  const level = inUnit(content, 'length')
  const ss = inUnit(content, 'per length')
  const name = new Map(content.materials.map((m) => [m.id, m.name]))
  return [
    sectionTitle(2, 'Ground'),
    sub('2.1', 'Materials'),
    {
      text: 'Hydraulic conductivity K (permeability k) along x and y in plan, with the range that the source supports.',
      margin: [0, 0, 0, 2],
    },
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
          cell: (m) => (m.kLow || m.kHigh ? `${k.show(m.kLow)} to ${k.show(m.kHigh)}` : '–'),
        },
        { head: 'Ss', unit: ss.unit, cell: (m) => ss.show(m.specificStorage) },
        { head: 'Sy', cell: (m) => formatNumber(m.specificYield) },
      ],
      content.materials,
    ),
    sub('2.2', 'Zones'),
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
        { head: 'Base', unit: level.unit, cell: (z) => level.show(z.base, 2) },
        { head: 'Top', unit: level.unit, cell: (z) => level.show(z.top, 2) },
      ],
      content.zones,
    ),
    sub('2.3', 'Named points'),
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
  ]
}

function waterSection(content: GatheredContent): Content[] {
  const rate = inUnit(content, 'rate')
  const recharge = inUnit(content, 'conductivity')
  const level = inUnit(content, 'length')
  const flux = inUnit(content, 'line flux')
  const { length } = content.project.units
  const total = (kind: 'abstraction' | 'recharge') =>
    content.wells
      .filter((w) => w.kind === kind)
      .reduce((sum, w) => sum + convert(w.rate, shownUnit('rate', content.project.units)), 0)
  return [
    sectionTitle(3, 'Water'),
    sub('3.1', 'Wells'),
    sourcedTable(
      '3.1',
      `Wells as entered: abstraction ${formatNumber(total('abstraction'))} ${rate.unit}, recharge ${formatNumber(total('recharge'))} ${rate.unit} in total`,
      [
        { head: 'Well', cell: (w) => w.name },
        { head: 'Kind', words: true, cell: (w) => w.kind },
        { head: 'x', unit: length, cell: (w) => formatNumber(w.x, 1) },
        { head: 'y', unit: length, cell: (w) => formatNumber(w.y, 1) },
        { head: 'Rate', unit: rate.unit, cell: (w) => rate.show(w.rate) },
        { head: 'Radius', unit: length, cell: (w) => level.show(w.radius, 2) },
        { head: 'Lowest', unit: length, cell: (w) => level.show(w.lowestLevel, 2) },
      ],
      content.wells,
    ),
    sub('3.2', 'Recharge zones'),
    sourcedTable(
      '3.2',
      'Recharge, the source term; zones add up where they overlap',
      [
        { head: 'Zone', cell: (r) => r.name },
        { head: 'Rate', unit: recharge.unit, cell: (r) => recharge.show(r.rate) },
        {
          head: 'Area',
          unit: `${length}²`,
          cell: (r) =>
            r.polygon ? formatNumber(Math.abs(signedArea(r.polygon as Vertex[])), 0) : 'everywhere',
        },
      ],
      content.rechargeZones,
    ),
    sub('3.3', 'Boundaries'),
    sourcedTable(
      '3.3',
      'Boundaries; every edge without one is a no-flow edge',
      [
        { head: 'Boundary', cell: (b) => b.name },
        { head: 'Kind', words: true, cell: (b) => b.kind },
        { head: 'Length', unit: length, cell: (b) => formatNumber(lineLength(b.line as Vertex[]), 0) },
        {
          head: 'Level',
          unit: length,
          cell: (b) => (b.levels ? b.levels.map((q) => level.show(q, 2)).join(' … ') : '–'),
        },
        {
          head: 'Flux',
          unit: flux.unit,
          cell: (b) => (b.flux ? `${flux.show(b.flux)} ${b.direction}` : '–'),
        },
        { head: 'Conductance', unit: recharge.unit, cell: (b) => recharge.show(b.conductance) },
      ],
      content.boundaries,
    ),
    sub('3.4', 'Cut-off walls'),
    sourcedTable(
      '3.4',
      'Walls, over the whole saturated thickness',
      [
        { head: 'Wall', cell: (w) => w.name },
        { head: 'Length', unit: length, cell: (w) => formatNumber(lineLength(w.line as Vertex[]), 1) },
        { head: 'Thickness', unit: length, cell: (w) => level.show(w.thickness, 2) },
        {
          head: 'K',
          unit: recharge.unit,
          cell: (w) => (w.k.value === 0 ? 'impermeable' : recharge.show(w.k)),
        },
      ],
      content.walls,
    ),
  ]
}

function casesSection(content: GatheredContent): Content[] {
  const { run } = content
  const { model, result } = run
  const { length } = content.project.units
  return [
    sectionTitle(4, 'Cases'),
    sub('4.1', 'The case of record'),
    facts([
      ['Case', run.caseName],
      ['Kind', `${model.kind}, ${model.flow}, ${model.time.kind}`],
      [
        'Extent',
        `x ${formatNumber(model.extent.x[0], 1)} to ${formatNumber(model.extent.x[1], 1)} ${length}, y ${formatNumber(model.extent.y[0], 1)} to ${formatNumber(model.extent.y[1], 1)} ${length}`,
      ],
      [
        'Grid',
        `${result.grid.columns} columns × ${result.grid.rows} rows, ${formatNumber(result.grid.active, 0)} cells active`,
      ],
      [
        'No-flow edges',
        result.noFlowEdges.length > 0 ? result.noFlowEdges.join(', ') : 'none: every edge has a boundary',
      ],
      ...(content.against
        ? ([['Compared with', `run ${content.against.number}, case ${content.against.caseName}`]] as [
            string,
            string,
          ][])
        : []),
    ]),
    sub('4.2', 'Solver record'),
    ...runRecord(content, run),
  ]
}

function runRecord(content: GatheredContent, run: GatheredRun): Content[] {
  const { result } = run
  const settings = run.model.solver
  return [
    facts([
      [
        'Run',
        `${run.number}, by ${run.by}, ${localTime(content, run.startedAt)} to ${localTime(content, run.endedAt)}`,
      ],
      ['Engine', `Lavant engine ${result.engine}`],
      ['Method', methodWords(result.method)],
      ['Outcome', result.converged ? 'converged' : 'DID NOT CONVERGE: not to be used'],
      ['Sweeps', formatNumber(result.iterations, 0)],
      [
        'Residual',
        `${scientific(result.residual)} of the right-hand side; asked ${scientific(settings?.tolerance ?? 1e-10)}`,
      ],
      ['Water-balance error', `${scientific(result.balance.errorPercent[0] ?? Number.NaN)} % of the inflow`],
      ['Model file (SHA-256)', run.inputSha256],
      ['Head field (SHA-256)', run.headsSha256],
    ]),
    ...(result.warnings.length > 0
      ? [
          table(
            '4.1',
            'Warnings of the run',
            [
              { head: 'Severity', cell: (w: (typeof result.warnings)[number]) => w.severity },
              { head: 'Warning', words: true, width: '*', cell: (w) => w.text },
            ],
            result.warnings,
          ),
        ]
      : [{ text: 'The run gave no warning.', margin: [0, 0, 0, 6] } as Content]),
  ]
}

function methodWords(method: string): string {
  return method === 'sor' ? 'successive over-relaxation, red-black order (the method of record)' : method
}

function scientific(value: number): string {
  return value === 0 ? '0' : formatNumber(value)
}

function headsSection({ content, heads, againstHeads }: DrawRequest): Content[] {
  const { run, against, project } = content
  const { result } = run
  const field = decodedField(heads)
  const rate = unitLabel(shownUnit('rate', project.units))
  const drawdown = against && againstHeads ? drawdownFigure(content, field, decodedField(againstHeads)) : null
  const againstHead = new Map(against?.result.points.map((p) => [p.name, p.head[0] ?? null]))
  const notConverged: Content[] = result.converged
    ? []
    : [
        {
          text: 'This run did not converge. Its heads are not a result.',
          color: alarm,
          bold: true,
          margin: [0, 0, 0, 6],
        },
      ]
  return [
    sectionTitle(5, 'Heads'),
    ...notConverged,
    headed(
      sub('5.1', 'Head contours'),
      figure(
        '5.1',
        headsFigure(content, field),
        `Heads, ${project.units.length} ${project.verticalDatum}; case ${run.caseName}, run ${run.number}, ${localDay(content, run.endedAt)}. `,
      ),
    ),
    ...(drawdown && against
      ? [
          headed(
            sub('5.2', 'Drawdown'),
            figure(
              '5.2',
              drawdown,
              `Drawdown in ${project.units.length} of run ${run.number} against run ${against.number} (${against.caseName}). `,
            ),
          ),
        ]
      : []),
    sub('5.3', 'Heads at named points'),
    table(
      '5.1',
      'Heads at named points',
      [
        { head: 'Point', cell: (p: (typeof result.points)[number]) => p.name },
        { head: 'Head', unit: project.units.length, cell: (p) => formatNumber(p.head[0] ?? null, 3) },
        ...(against
          ? [
              {
                head: 'Drawdown',
                unit: project.units.length,
                cell: (p: (typeof result.points)[number]) => {
                  const before = againstHead.get(p.name)
                  const now = p.head[0]
                  return formatNumber(
                    typeof before === 'number' && typeof now === 'number' ? before - now : null,
                    3,
                  )
                },
              },
            ]
          : []),
        { head: 'Note', words: true, width: '*', cell: (p) => p.why ?? '' },
      ],
      result.points,
    ),
    sub('5.4', 'Wells'),
    table(
      '5.2',
      'Rates and levels of the wells',
      [
        { head: 'Well', cell: (w: (typeof result.wells)[number]) => w.name },
        { head: 'Requested', unit: rate, cell: (w) => formatNumber(w.requested[0] ?? null) },
        { head: 'Achieved', unit: rate, cell: (w) => formatNumber(w.achieved[0] ?? null) },
        {
          head: 'Cell head',
          unit: project.units.length,
          cell: (w) => formatNumber(w.cellHead[0] ?? null, 2),
        },
        {
          head: 'Head at well face',
          unit: project.units.length,
          cell: (w) => formatNumber(w.wellHead[0] ?? null, 2),
        },
      ],
      result.wells,
    ),
    sub('5.5', 'Water balance'),
    balanceTable(content),
    caution(
      'Drawdown bears on safety and on neighbours. The method leaves out vertical flow within the aquifer, ground finer than section 2 and change with time. ' +
        'Well losses are not in the head at the well face. The figures are not a substitute for the judgement of a qualified engineer; local codes and licensed practice govern.',
    ),
  ]
}

/** The field as figures want it: edges and heads. */
function decodedField(buffer: Uint8Array): HeadField {
  const { grid, heads } = decodeHeads(buffer)
  return { xEdges: grid.xEdges, yEdges: grid.yEdges, heads }
}

function balanceTable(content: GatheredContent): Content {
  const { result } = content.run
  const rate = unitLabel(shownUnit('rate', content.project.units))
  const wells = result.balance.kinds.find((kind) => kind.kind === 'wells')
  const parts = [
    ...result.boundaries.map((part) => ({ ...part, kind: boundaryKind(content, part.name) })),
    ...result.recharge.map((part) => ({ ...part, kind: 'recharge' })),
    ...result.leakage.map((part) => ({ ...part, kind: 'leakage' })),
    ...(wells ? [{ ...wells, name: 'All wells', kind: 'wells' }] : []),
    { name: 'Total', kind: '', inflow: result.balance.inflow, outflow: result.balance.outflow },
  ]
  return table(
    '5.3',
    `Water balance; error ${scientific(result.balance.errorPercent[0] ?? Number.NaN)} % of the inflow`,
    [
      { head: 'Part', width: '*', cell: (part) => part.name },
      { head: 'Kind', words: true, width: 130, cell: (part) => part.kind },
      { head: 'Inflow', unit: rate, width: 85, cell: (part) => formatNumber(part.inflow[0] ?? null, 2) },
      { head: 'Outflow', unit: rate, width: 85, cell: (part) => formatNumber(part.outflow[0] ?? null, 2) },
    ],
    parts,
  )
}

function boundaryKind(content: GatheredContent, name: string): string {
  return content.boundaries.find((boundary) => boundary.name === name)?.kind ?? 'boundary'
}

function readingsSection(content: GatheredContent): Content[] {
  const { length } = content.project.units
  const level = inUnit(content, 'length')
  return [
    sectionTitle(6, 'Readings'),
    sub('6.1', 'Instruments'),
    table(
      '6.1',
      `Instruments and last heads, ${length} ${content.project.verticalDatum}`,
      [
        { head: 'Instrument', cell: (i) => i.name },
        { head: 'Kind', words: true, cell: (i) => i.kind },
        {
          head: 'Response zone',
          unit: length,
          cell: (i) =>
            i.responseTop ? `${level.show(i.responseTop, 1)} to ${level.show(i.responseBase, 1)}` : '–',
        },
        { head: 'Readings', cell: (i) => formatNumber(i.readings, 0) },
        { head: 'From', cell: (i) => localDay(content, i.first) },
        { head: 'To', cell: (i) => localDay(content, i.last) },
        { head: 'Last head', unit: length, cell: (i) => formatNumber(i.lastHead, 2) },
      ],
      content.instruments,
    ),
    sub('6.2', 'Reference levels'),
    table(
      '6.2',
      'History of reference levels',
      [
        { head: 'Instrument', cell: (r) => r.instrument },
        { head: 'From', words: true, cell: (r) => localTime(content, r.from) },
        { head: 'Level', unit: length, cell: (r) => level.show(r.level, 3) },
        { head: 'Levelled', words: true, cell: (r) => r.levelled },
        { head: 'Reason', words: true, width: '*', cell: (r) => r.reason },
      ],
      content.instruments.flatMap((i) => i.referenceLevels.map((r) => ({ ...r, instrument: i.name }))),
    ),
    sub('6.3', 'Imported files'),
    table(
      '6.3',
      'Files as they came, by SHA-256',
      [
        { head: 'File', words: true, cell: (f) => f.file },
        { head: 'Rows', cell: (f) => formatNumber(f.rows, 0) },
        { head: 'Added', cell: (f) => formatNumber(f.added, 0) },
        { head: 'Imported', words: true, cell: (f) => `${localDay(content, f.committedAt)}, ${f.by}` },
        { head: 'SHA-256', words: true, width: '*', cell: (f) => `${f.sha256.slice(0, 16)}…` },
      ],
      content.imports,
    ),
  ]
}

function fitSection({ content, heads }: DrawRequest): Content[] {
  const { lines, statistics, date } = content.fit
  const { length } = content.project.units
  if (lines.length === 0) {
    return [sectionTitle(7, 'Fit'), { text: 'No readings were compared with this run.', color: grey }]
  }
  const oneToOne = oneToOneFigure(content)
  const plan = residualFigure(content, decodedField(heads))
  return [
    sectionTitle(7, 'Fit'),
    sub('7.1', 'Measured against modelled'),
    {
      text: `Run ${content.run.number} against readings of ${localDay(content, date)}. Residual = measured − modelled: above zero where the modelled head is too low.`,
      margin: [0, 0, 0, 4],
    },
    table(
      '7.1',
      'Residuals',
      [
        { head: 'Instrument', cell: (l) => l.name },
        { head: 'Read', words: true, cell: (l) => localTime(content, l.at) },
        { head: 'Measured', unit: length, cell: (l) => formatNumber(l.measured, 2) },
        { head: 'Modelled', unit: length, cell: (l) => formatNumber(l.modelled, 2) },
        { head: 'Residual', unit: length, cell: (l) => signed(l.residual) },
        { head: 'Note', words: true, width: '*', cell: (l) => l.why ?? '' },
      ],
      lines,
    ),
    ...(statistics
      ? [
          facts([
            ['Comparisons n', String(statistics.n)],
            ['Bias (mean residual)', `${signed(statistics.bias)} ${length}`],
            ['MAE', `${formatNumber(statistics.mae, 3)} ${length}`],
            ['RMSE', `${formatNumber(statistics.rmse, 3)} ${length}`],
            [
              'Scaled RMSE',
              statistics.scaledRmse === null
                ? '–'
                : `${formatNumber(100 * statistics.scaledRmse, 1)} % of the measured range`,
            ],
            ['Largest residual', `${signed(statistics.largest)} ${length}`],
          ]),
        ]
      : []),
    ...(oneToOne ? [figure('7.1', oneToOne, '', 0.72)] : []),
    ...(plan ? [figure('7.2', plan, `Residuals in ${length} at their instruments. `)] : []),
  ]
}

function signed(value: number | null): string {
  if (value === null) return '–'
  return `${value > 0 ? '+' : ''}${formatNumber(value, 2)}`
}

function checksSection(content: GatheredContent): Content[] {
  return [
    sectionTitle(8, 'Checks'),
    sub('8.1', 'Independent estimates'),
    table(
      '8.1',
      'Estimates by hand or formula beside the computed figure',
      [
        { head: 'Result', words: true, width: 110, cell: (e) => e.result },
        {
          head: 'Method',
          words: true,
          width: '*',
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
    caution(
      'Uplift, heave and exit gradients are not computed in plan: they need a vertical section and a check of their own. ' +
        'Nothing in this section says that the works comply with a standard.',
    ),
  ]
}

function packageSection(content: GatheredContent, cover: GatheredCover): Content[] {
  const title = new Map(sections.map((s) => [s.key, `${s.number} ${s.title}`]))
  return [
    sectionTitle(9, 'Package'),
    sub('9.1', 'Conclusions'),
    {
      text: content.basis?.conclusions || 'No conclusion has been written in section 1.',
      margin: [0, 0, 0, 6],
    },
    sub('9.2', 'Limitations and cautions'),
    {
      ul: [
        'Steady flow in plan: heads do not vary with depth, and change with time is left out.',
        'A wall and a well act over the whole saturated thickness. Flow under the toe of a hanging wall needs a vertical section.',
        'Ground between boreholes is as section 2 states it; no allowance is made for ground that nobody has seen.',
        'An edge without a boundary carries no flow. Where an outer boundary stands for distance, results near it depend on it.',
        'Well losses, clogging, and the order of construction are left out.',
        'The unsaturated zone, density and temperature are left out.',
        ...(content.basis?.notFor ? [`Not for: ${content.basis.notFor}`] : []),
      ],
      margin: [0, 0, 0, 8],
    },
    sub('9.3', 'Checking'),
    table(
      '9.1',
      'Sections of the book when this document was drawn',
      [
        { head: 'Section', cell: (s) => title.get(s.key) ?? s.key },
        { head: 'State', words: true, cell: (s) => s.state },
        { head: 'Checked by', words: true, width: '*', cell: (s) => s.checkedBy ?? '–' },
        { head: 'On', words: true, cell: (s) => localDay(content, s.checkedAt) },
      ],
      cover.sections,
    ),
    sub('9.4', 'Revisions'),
    table(
      '9.2',
      'Revision history',
      [
        { head: 'Revision', cell: (r) => r.revision },
        { head: 'Status', words: true, cell: (r) => r.status },
        { head: 'Reason', words: true, width: '*', cell: (r) => r.reason },
        { head: 'Issued', words: true, cell: (r) => localDay(content, r.issuedAt) },
      ],
      cover.revisions,
    ),
    sub('9.5', 'Record'),
    facts([
      ['Input hash (SHA-256)', cover.inputSha256],
      ['Model file (SHA-256)', content.run.inputSha256],
      ['Head field (SHA-256)', content.run.headsSha256],
      ['Engine', `Lavant engine ${content.run.result.engine}`],
      ['Kept at', cover.address],
    ]),
  ]
}
