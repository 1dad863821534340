import { execFileSync } from 'node:child_process'
import { createHash } from 'node:crypto'
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { encodeHeads } from '~/solver/heads-buffer'
import { formatNumber } from '~/units'
import { drawPackage } from './draw'
import type { DrawRequest, GatheredContent } from './gathered'

const folder = mkdtempSync(join(tmpdir(), 'lavant-package-'))
afterAll(() => rmSync(folder, { recursive: true }))

/** Reads a PDF as a stranger would: with Poppler, not with the library that wrote it. */
function read(pdf: Buffer) {
  const file = join(folder, `${createHash('sha256').update(pdf).digest('hex').slice(0, 12)}.pdf`)
  writeFileSync(file, pdf)
  const run = (program: string, ...options: string[]) =>
    execFileSync(program, options, { encoding: 'utf8', maxBuffer: 64e6, stdio: ['ignore', 'pipe', 'ignore'] })
  const text = run('pdftotext', '-layout', file, '-')
  return {
    text,
    pages: text.split('\f').slice(0, -1),
    words: text.replace(/\s+/g, ' '),
    /** Pages as they were drawn, word by word, rotated type included. */
    drawn: () => run('pdftotext', '-raw', file, '-').split('\f').slice(0, -1),
    /** For each page, whether it bears type more than 60 points tall: the mark across it. */
    largeTypeOnPages: () =>
      run('pdftotext', '-bbox', file, '-')
        .split('<page')
        .slice(1)
        .map((page) =>
          [...page.matchAll(/yMin="([\d.]+)" xMax="[\d.]+" yMax="([\d.]+)"/g)].some(
            ([, top, bottom]) => Number(bottom) - Number(top) > 60,
          ),
        ),
    fonts: () => run('pdffonts', file),
    facts: () => run('pdfinfo', file),
    outline: () => {
      const xml = run('pdftohtml', '-xml', '-i', '-stdout', file)
      return xml.slice(xml.indexOf('<outline>'))
    },
  }
}

const columns = 24
const rows = 16

/** Heads that fall from west to east over 240 by 160, in the unit of the project. */
function fallingHeads(lowered = 0): Uint8Array {
  const xEdges = Float64Array.from({ length: columns + 1 }, (_, i) => 10 * i)
  const yEdges = Float64Array.from({ length: rows + 1 }, (_, i) => 10 * i)
  const heads = Float64Array.from(
    { length: columns * rows },
    (_, cell) => 12 - 0.1 * (cell % columns) - lowered,
  )
  return new Uint8Array(encodeHeads({ columns, rows, xEdges, yEdges }, heads))
}

const hash = (letter: string) => letter.repeat(64)
const m = (value: number) => ({ value, unit: 'm' as const })

function content(change: (content: GatheredContent) => void = () => {}): GatheredContent {
  const run = (number: number): GatheredContent['run'] => ({
    number,
    caseName: number === 1 ? 'Before pumping' : 'Pumping',
    inputSha256: hash('b'),
    headsSha256: hash('c'),
    by: 'I. Sedge',
    startedAt: '2026-03-02T09:00:00Z',
    endedAt: '2026-03-02T09:01:00Z',
    model: {
      format: 'lavant-model',
      version: 1,
      units: { length: 'm', time: 'd' },
      kind: 'plan',
      flow: 'confined',
      extent: { x: [0, 240], y: [0, 160] },
      grid: { cellSize: 10 },
      time: { kind: 'steady' },
      materials: [],
      ground: [],
      solver: { tolerance: 1e-9 },
    } as unknown as GatheredContent['run']['model'],
    result: {
      format: 'lavant-result',
      version: 1,
      engine: '0.1.0',
      converged: true,
      method: 'sor',
      kernels: 'typescript',
      iterations: 812,
      residual: 3.21e-10,
      grid: { columns, rows, cells: columns * rows, active: columns * rows },
      times: [],
      points: [
        { name: 'P1', head: [number === 1 ? 11.987 : 10.456] },
        { name: 'P2', head: [null], why: 'outside the extent of the case' },
      ],
      wells: [{ name: 'W1', requested: [86.4], achieved: [86.4], cellHead: [9.31], wellHead: [8.77] }],
      lines: [],
      rings: [],
      boundaries: [{ name: 'River Lode', inflow: [71.23], outflow: [4.56] }],
      recharge: [{ name: 'Rain', inflow: [19.73], outflow: [0] }],
      leakage: [],
      balance: {
        inflow: [90.96],
        outflow: [90.96],
        storage: [0],
        errorPercent: [0.0021],
        kinds: [{ kind: 'wells', inflow: [0], outflow: [86.4] }],
        worstCell: [{ at: [410, 95], error: 2e-9 }],
      },
      noFlowEdges: ['north', 'south'],
      warnings: [],
      history: [],
      headError: 2.5e-7,
    },
  })
  const made: GatheredContent = {
    format: 'lavant-package',
    version: 1,
    project: {
      number: '26-0007',
      title: 'Lode Street shaft',
      client: 'Fenland Tunnels',
      calcReference: 'LS-GW-001',
      crsEpsg: 27700,
      verticalDatum: 'above site datum',
      timeZone: 'Europe/London',
      units: { length: 'm', time: 'd' },
    },
    basis: {
      question: 'How far must the head fall?',
      accuracy: 'Heads to 0.3 m.',
      intendedUse: 'Choice of pumps.',
      notFor: 'Uplift of the base.',
      idealisation: 'Steady plan flow.',
      conclusions: 'One well is enough.',
    },
    assumptions: [
      {
        id: 'a1',
        reference: 'A1',
        statement: 'The clay is level.',
        why: 'Boreholes',
        effect: 'small',
        source: 'GI-1',
      },
    ],
    standards: [],
    materials: [
      {
        id: 'sand',
        name: 'Sand',
        kx: { value: 14, unit: 'm/d' },
        ky: { value: 14, unit: 'm/d' },
        kLow: null,
        kHigh: null,
        specificStorage: null,
        specificYield: null,
        porosity: null,
        source: '',
      },
    ],
    zones: [
      {
        id: 'z1',
        name: 'Everywhere',
        materialId: 'sand',
        polygon: null,
        base: m(0),
        top: m(8),
        source: 'GI-1',
      },
    ],
    points: [
      { id: 'p1', name: 'P1', x: 60, y: 80, source: 'IR-1' },
      { id: 'p2', name: 'P2', x: 900, y: 80, source: 'IR-1' },
    ],
    planImage: null,
    wells: [
      {
        id: 'w1',
        name: 'W1',
        x: 125,
        y: 85,
        kind: 'abstraction',
        rate: { value: 86.4, unit: 'm3/d' },
        radius: m(0.15),
        lowestLevel: null,
        screenTop: null,
        screenBottom: null,
        source: 'WD-1',
      },
    ],
    rechargeZones: [
      { id: 'r1', name: 'Rain', polygon: null, rate: { value: 0.5, unit: 'mm/d' }, source: 'Gauge' },
    ],
    boundaries: [
      {
        id: 'b1',
        name: 'River Lode',
        kind: 'head-dependent flux',
        line: [
          [0, 0],
          [0, 80],
          [0, 160],
        ],
        levels: [m(12.4), m(12.31), m(12.2)],
        flux: null,
        direction: 'into the model',
        conductance: { value: 1.7, unit: 'm/d' },
        disconnectsBelow: null,
        outer: false,
        source: 'Survey 3',
      },
    ],
    walls: [
      {
        id: 'c1',
        name: 'Cut-off',
        line: [
          [100, 60],
          [150, 60],
        ],
        thickness: m(0.8),
        k: { value: 0.001, unit: 'm/d' },
        toe: m(-2.5),
        source: 'CW-1',
      },
    ],
    run: run(2),
    against: run(1),
    instruments: [],
    imports: [],
    fit: {
      date: '2026-03-01',
      lines: [
        {
          name: 'P1',
          at: '2026-03-01T10:00:00Z',
          measured: 10.61,
          modelled: 10.456,
          residual: 0.154,
          why: null,
        },
        { name: 'P3', at: null, measured: null, modelled: 9.9, residual: null, why: 'dry' },
      ],
      statistics: { n: 1, bias: 0.154, mae: 0.154, rmse: 0.154, scaledRmse: null, largest: 0.154 },
    },
    estimates: [],
  }
  change(made)
  return made
}

function request(
  change?: (content: GatheredContent) => void,
  status: DrawRequest['cover']['status'] = 'draft',
): DrawRequest {
  const made = content(change)
  return {
    content: made,
    cover: {
      revision: 'P01',
      status,
      purpose: 'Approval',
      reason: 'First issue',
      madeBy: 'I. Sedge',
      madeAt: '2026-03-02T10:00:00Z',
      issuedAt: status === 'issued' ? '2026-03-05T10:00:00Z' : null,
      distribution: 'Site team',
      inputSha256: hash('a'),
      signatures: [{ role: 'originator', name: 'I. Sedge', at: '2026-03-02T11:00:00Z' }],
      revisions: [{ revision: 'P01', status, reason: 'First issue', issuedAt: null }],
      sections: [{ key: 'basis', state: 'checked', checkedBy: 'H. Reed', checkedAt: '2026-03-03T10:00:00Z' }],
      address: 'https://lavant.test/projects/1/package',
    },
    heads: fallingHeads(),
    againstHeads: made.against ? fallingHeads(-1) : null,
  }
}

describe('A package that is drawn', () => {
  let pdf: Buffer
  let paper: ReturnType<typeof read>
  beforeAll(async () => {
    pdf = await drawPackage(request())
    paper = read(pdf)
  })

  it('gives the same bytes for the same content', async () => {
    expect((await drawPackage(request())).equals(pdf)).toBe(true)
  })

  it('carries its reference, revision and page of pages on every A4 page', () => {
    expect(paper.pages.length).toBeGreaterThan(8)
    for (const [index, page] of paper.pages.entries()) {
      expect(page).toContain(`LS-GW-001 P01 · page ${index + 1} of ${paper.pages.length}`)
    }
    expect(paper.facts()).toMatch(/Page size:.*A4/)
    expect(paper.facts()).toMatch(/Title:\s+Lode Street shaft: LS-GW-001 P01/)
  })

  it('prints every part of the water balance, the heads at points, the wells and the residuals', () => {
    for (const figure of ['71.23', '4.56', '19.73', '86.40', '90.96', '10.456', '1.531', '8.77', '+0.154']) {
      expect(paper.words).toContain(figure)
    }
    expect(paper.words).toContain(formatNumber(0.0021))
    expect(paper.words).toContain('outside the extent of the case')
  })

  it('prints the inputs with the source of each, and says where none is stated', () => {
    expect(paper.words).toMatch(/Sand 14 14 not stated/)
    expect(paper.words).toContain('Survey 3')
    expect(paper.words).toMatch(/\(0\.0, 80\.0\) at 12\.31/)
    expect(paper.words).toMatch(/Of \d+ input rows, 1 have no source/)
  })

  it('names the input by its hash and the engine, and warns of what the method leaves out', () => {
    expect(paper.words).toContain(hash('a'))
    expect(paper.words).toContain('Lavant engine 0.1.0')
    expect(paper.words).toContain('does not replace the judgement of a qualified engineer')
    expect(paper.words).not.toMatch(/complies with/)
  })

  it('has contents on one page, and bookmarks for sections with their parts below them', () => {
    const contents = paper.pages.findIndex((page) => page.includes('Contents'))
    expect(paper.pages[contents]).toContain('9.5')
    expect(paper.pages[contents + 1]).toContain('Question and use')
    const outline = paper.outline()
    expect(outline).toMatch(
      /3 {3}Water<\/item>\s*<outline>\s*<item page="\d+">3\.1 {3}Wells<\/item>[\s\S]*3\.4 {3}Cut-off walls/,
    )
    expect(outline.match(/<item page="\d+">\d {3}/g)).toHaveLength(9)
  })

  it('embeds Source Sans 3 with the letters that the trade needs', () => {
    const fonts = paper.fonts().split('\n').slice(2).filter(Boolean)
    for (const font of fonts) expect(font).toMatch(/SourceSans3.*\byes\s+yes\s+yes\b/)
    for (const letter of ['Ω', '≤', 'α', 'Δ', '∂', '−', '³']) expect(paper.text).toContain(letter)
    expect(paper.text).not.toContain('\ufffd')
  })

  it('is marked on every page until it is issued', async () => {
    expect(paper.largeTypeOnPages()).toEqual(paper.pages.map(() => true))
    const issued = read(await drawPackage(request(undefined, 'issued')))
    expect(issued.largeTypeOnPages()).not.toContain(true)
    expect(issued.words).not.toContain('DRAFT')
    expect(issued.words).toContain('Issued on 5 Mar 2026')
  })
})

describe('A package of an unusual project', () => {
  it('is drawn in feet', async () => {
    const paper = read(
      await drawPackage(
        request((made) => {
          made.project.units = { length: 'ft', time: 'd' }
        }),
      ),
    )
    expect(paper.words).toContain('ft³/d')
    // 14 m/d, 86.4 m³/d and 0.15 m in feet.
    expect(paper.words).toMatch(/Sand 45\.93 45\.93/)
    expect(paper.words).toContain(formatNumber(86.4 / 0.3048 ** 3))
    expect(paper.words).toContain('0.49')
  })

  it('is drawn without readings, walls, wells, a run to compare with, or a written basis', async () => {
    const paper = read(
      await drawPackage(
        request((made) => {
          made.walls = []
          made.wells = []
          made.run.result.wells = []
          made.against = null
          made.basis = null
          made.assumptions = []
          made.fit = { date: null, lines: [], statistics: null }
        }),
      ),
    )
    expect(paper.words).toContain('No readings were compared with this run.')
    expect(paper.words).toContain('The heads have not been held against any reading.')
    expect(paper.words).toContain('Section 1 of the book is empty.')
    expect(paper.words).toMatch(/Cut-off walls; in plan each acts over the whole saturated thickness: none/)
    expect(paper.words).not.toContain('5.5 Drawdown')
  })

  it('prints the error band beside a head where the run has one, and what the run tried to get it', async () => {
    const paper = read(
      await drawPackage(
        request((made) => {
          const { result } = made.run
          const point = result.points[0]
          if (point) point.band = [[10.44, 10.472]]
          result.verification = {
            grid: {
              grids: [
                { columns: 48, rows: 32, cells: 1536, times: 0.5 },
                { columns: 24, rows: 16, cells: 384, times: 1 },
              ],
              why: 'its own and one of half the cell size',
            },
            time: null,
            outerBoundary: [{ text: 'River Lode closed.', done: true }],
            formula: null,
            results: [
              {
                name: 'points/P1',
                band: [[10.44, 10.472]],
                order: [2],
                extrapolated: [10.45],
                how: ['observed order'],
                gridError: [0.016],
                swapped: [{ text: 'River Lode closed.', values: [9.956] }],
              },
            ],
          }
        }),
      ),
    )
    const one = paper.drawn().join(' ').replace(/\s+/g, ' ')
    expect(one).toContain('P1 10.456 10.440 to 10.472')
    expect(one).toContain('1536 and 384 cells')
    expect(one).toContain('heads change by up to 0.50 m, most at P1 River Lode closed.')
    expect(one).toContain('It says nothing of the inputs')
  })

  it('prints beside a warning who accepted it, when and why, and says of one that nobody has accepted', async () => {
    const paper = read(
      await drawPackage(
        request((made) => {
          const warning = (text: string) =>
            ({ code: 'hanging-wall', severity: 'check', text, accept: true }) as const
          made.run.result.warnings = [
            warning('The wall hangs.'),
            { code: 'n', severity: 'note', text: 'By the way.' },
          ]
          made.run.acceptances = [
            {
              code: 'hanging-wall',
              warning: 'The wall hangs.',
              by: 'I. Sedge',
              at: '2026-03-02T10:30:00Z',
              reason: 'A vertical section shows less than 2 % under the toe.',
            },
          ]
          if (made.against) made.against.result.warnings = [warning('The other wall hangs.')]
        }),
      ),
    )
    expect(paper.words).toMatch(/Warnings of the runs/)
    const one = paper.drawn().join(' ').replace(/\s+/g, ' ')
    expect(one).toContain(
      '2 Look before use The wall hangs. accepted by I. Sedge on 2 Mar 2026: A vertical section shows less than 2 % under the toe.',
    )
    expect(one).toContain('2 For information By the way. –')
    expect(one).toContain('1 Look before use The other wall hangs. by nobody yet: not for issue')
  })

  it('says so in words when its run did not converge', async () => {
    const paper = read(
      await drawPackage(
        request((made) => {
          made.run.result.converged = false
        }),
      ),
    )
    expect(paper.words).toContain('This run did not converge. Its heads are not a result.')
    expect(paper.words).toContain('DID NOT CONVERGE')
  })

  it('loses no row of 300 wells, nor a word of names and texts as long as the book allows', {
    timeout: 180_000,
  }, async () => {
    const long = (words: string, length: number) =>
      words.repeat(Math.ceil(length / words.length)).slice(0, length)
    const paper = read(
      await drawPackage(
        request((made) => {
          made.project.title = long('Deep shaft by the old brewery ', 195).concat('LASTT')
          made.wells = Array.from({ length: 300 }, (_, index) => ({
            ...(made.wells[0] as GatheredContent['wells'][number]),
            id: `w${index}`,
            name: `Well-${index + 1}-${long('x', 40 - 9)}`,
            x: 5 + (index % 20) * 11,
            y: 5 + Math.floor(index / 20) * 10,
          }))
          made.run.result.wells = made.wells.map((well, index) => ({
            name: well.name,
            requested: [1],
            achieved: [1],
            cellHead: [9],
            wellHead: [-(index + 1) / 100],
          }))
          made.assumptions = [
            {
              id: 'a1',
              reference: 'A1',
              statement: `${long('because the ground was seen ', 990)} LASTS`,
              why: `${long('in the pit ', 990)} LASTW`,
              effect: `${long('it is small ', 990)} LASTE`,
              source: `${long('letter ', 490)} LASTQ`,
            },
          ]
          if (made.basis) {
            made.basis.question = `${long('How far must it fall? ', 1990)} LASTA`
            made.basis.conclusions = `${long('It is enough. ', 3990)} LASTB`
            made.basis.notFor = `${long('Anything else. ', 990)} LASTN`
          }
          made.run.caseName = `${long('Case of pumping ', 190)} LASTC`
        }),
      ),
    )
    for (let well = 1; well <= 300; well++) {
      expect(paper.text).toContain(`Well-${well}-`)
      expect(paper.text).toContain(formatNumber(-well / 100, 2))
    }
    for (const mark of ['LASTT', 'LASTS', 'LASTW', 'LASTE', 'LASTQ', 'LASTA', 'LASTB', 'LASTN', 'LASTC']) {
      expect(paper.text).toContain(mark)
    }
    // The table goes on under its own head.
    const heads = paper.drawn().filter((page) => /Kind x m y m Rate m³\/d/.test(page))
    expect(heads.length).toBeGreaterThan(5)
  })
})
