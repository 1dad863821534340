import { atGrid, basinA, basinB, cutOffWall, type PlanVertex, planExtent, river } from './site-plan.ts'

/**
 * The rows of the demo's calc book. Site, people, firm and figures are invented; the numbers are of a size that such a
 * site could have. Ids here are names: the seed gives each row an id of its own.
 */
const at = (vertex: PlanVertex) => {
  const [x, y] = atGrid(vertex)
  return { x, y }
}
const ring = (vertices: PlanVertex[]) => vertices.map(atGrid)
const metres = (value: number) => ({ value, unit: 'm' })
const perDay = (value: number) => ({ value, unit: 'm/d' })
const rate = (value: number) => ({ value, unit: 'm3/d' })

export const demoProject = {
  number: '26-0417',
  title: 'Tarrow Quay deep shaft',
  client: 'Quayside Water',
  calcReference: 'TQ-GW-014',
  crsEpsg: 27700,
  verticalDatum: 'site datum',
  timeZone: 'Europe/London',
  lengthUnit: 'm',
  timeUnit: 'd',
} as const

export const demoProgress = {
  stage: 'Pumping holds the water below the dig; weekly readings continue until the base slab is cast.',
  nextStep: 'Revision P02 with the autumn readings, from the hydrogeologist to the checker by 11 December.',
}

export const demoBasis = {
  question:
    'What must the eight wells pump so that the head under the shaft excavation stays at least 0.5 m below the dig level of −1.0 m, and how far does the water table fall at Chapel Row and at the Chapel while they do?',
  accuracy: 'Heads under the dig to 0.3 m; total abstraction to 20 %; drawdown at Chapel Row to 0.2 m.',
  intendedUse:
    'Choice of pumps and standby plant; input to the settlement assessment; trigger levels for the instruments.',
  notFor:
    'Uplift or heave of the base, structural design of the wall, or the quality of the discharged water.',
  idealisation:
    'Steady flow in plan in one unconfined aquifer of sand and gravel over stiff clay. Vertical flow is small against horizontal flow at the distances of interest; around the toe of the wall it is not, and the wall is taken to the clay. Steady state is reached within weeks and is the worst case for drawdown next door.',
  conclusions:
    'At the rates of section 3 the head under the dig stays below −1.5 m. Drawdown at Chapel Row is given in section 5 and goes to the settlement assessment. The result depends most on the conductivity of the gravel belt and on the leakiness of the river bed; both should be looked at again when the wells have pumped for a month.',
}

export const demoCover = {
  purposeOfIssue: 'Approval of the dewatering scheme',
  distribution: 'Quayside Water (project engineer); site team; file',
  remarks: '',
}

export const demoAssumptions = [
  {
    reference: 'A1',
    statement: 'The base of the aquifer is the top of the stiff clay at −14 m, level over the site.',
    why: 'Boreholes BH1 to BH6 found it between −13.6 and −14.3 m.',
    effect: 'A base 0.5 m lower adds about 4 % to the abstraction.',
    source: 'Ground investigation report GI-02, figures 4 to 6',
  },
  {
    reference: 'A2',
    statement: 'The cut-off wall reaches the clay along its whole length.',
    why: 'Toe levels in the piling records.',
    effect: 'A hanging wall would pass more water and needs a vertical section.',
    source: 'Piling records PR-01 to PR-31',
  },
  {
    reference: 'A3',
    statement: 'The river is in contact with the aquifer through a bed that resists the flow.',
    why: 'P10 follows the river with about half its range.',
    effect: 'A bed twice as leaky raises the abstraction by about a tenth.',
    source: 'Readings of P10 and the river gauge, winter 2025/26',
  },
  {
    reference: 'A4',
    statement: 'Recharge is spread evenly at 0.7 mm/d, apart from the two soakaway basins.',
    why: 'About a third of the mean rainfall of 780 mm a year.',
    effect: 'Small: recharge is a minor part of the water balance while the wells pump.',
    source: 'Site rain gauge 2021 to 2025',
  },
]

export const demoStandards = [
  {
    title: 'Firm’s guide to dewatering calculations',
    edition: 'issue 4, 2024',
    status: 'current',
    use: 'Layout of the calculation, check categories',
  },
  {
    title: 'EN 1997-1 Geotechnical design: general rules',
    edition: '2004 with national annex',
    status: 'not known',
    use: 'Vocabulary of limit states; no check against it is made here',
  },
]

export const demoMaterials = [
  {
    key: 'sand',
    name: 'Terrace sand and gravel',
    kx: perDay(16),
    ky: perDay(16),
    kLow: perDay(9),
    kHigh: perDay(26),
    specificStorage: { value: 1e-5, unit: '1/m' },
    specificYield: 0.2,
    porosity: 0.3,
    source: 'Pumping test PT-2, March 2026, sheets 3 to 7',
  },
  {
    key: 'gravel',
    name: 'Gravel belt by the river',
    kx: perDay(38),
    ky: perDay(38),
    kLow: perDay(25),
    kHigh: perDay(60),
    specificStorage: { value: 1e-5, unit: '1/m' },
    specificYield: 0.22,
    porosity: 0.28,
    source: 'Gradings of BH5 and BH6; pumping test PT-1, April 2026',
  },
]

export const demoZones = [
  {
    name: 'Aquifer',
    material: 'sand',
    polygon: null,
    base: metres(-14),
    top: null,
    source: 'Ground investigation report GI-02, figures 4 to 6',
  },
  {
    name: 'Gravel belt',
    material: 'gravel',
    polygon: ring([
      [0, 0],
      [1200, 0],
      [1200, 190],
      [900, 200],
      [600, 235],
      [300, 215],
      [0, 180],
    ]),
    base: metres(-14),
    top: null,
    source: 'Geophysical lines G1 to G3, interpreted edge',
  },
]

export const demoWells = (
  [
    ['W1', [534, 286], 390],
    ['W2', [572, 284], 420],
    ['W3', [628, 284], 420],
    ['W4', [668, 300], 375],
    ['W5', [668, 345], 285],
    ['W6', [628, 384], 255],
    ['W7', [572, 384], 255],
    ['W8', [532, 345], 285],
  ] as [string, PlanVertex, number][]
).map(([name, place, pumped]) => ({
  name,
  ...at(place),
  kind: 'abstraction',
  rate: rate(pumped),
  radius: metres(0.15),
  lowestLevel: metres(-12.5),
  screenTop: metres(-1),
  screenBottom: metres(-13.5),
  source: 'Wells as drilled, record sheets WD-01 to WD-08, revision B',
}))

export const demoRecharge = [
  {
    name: 'Rain',
    polygon: null,
    rate: { value: 0.7, unit: 'mm/d' },
    source: 'Site rain gauge 2021 to 2025, a third of the mean',
  },
  {
    name: 'Basin A',
    polygon: ring(basinA),
    rate: { value: 14, unit: 'mm/d' },
    source: 'Soakaway design SD-07, mean inflow over the area',
  },
  {
    name: 'Basin B',
    polygon: ring(basinB),
    rate: { value: 9, unit: 'mm/d' },
    source: 'Soakaway design SD-07, mean inflow over the area',
  },
]

const { xMin, xMax, yMin, yMax } = planExtent

export const demoBoundaries = [
  {
    name: 'North edge',
    kind: 'fixed head',
    line: ring([
      [xMin, yMax],
      [xMax, yMax],
    ]),
    levels: [metres(3.1), metres(2.6)],
    flux: null,
    direction: 'into the model',
    conductance: null,
    disconnectsBelow: null,
    outer: true,
    source: 'Contours of the winter survey, January 2026, carried to the edge',
  },
  {
    name: 'River Tarrow',
    kind: 'head-dependent flux',
    line: ring(river),
    levels: river.map((_, i) => metres(Number((1.25 - 0.05 * i).toFixed(2)))),
    flux: null,
    direction: 'into the model',
    conductance: perDay(2.4),
    disconnectsBelow: metres(-1.5),
    outer: false,
    source: 'River gauge at Boat Shed steps, mean of 2026; bed from grab samples S1 to S5',
  },
]

export const demoWalls = [
  {
    name: 'Cut-off wall',
    line: ring(cutOffWall),
    thickness: metres(0.8),
    k: perDay(0.001),
    toe: metres(-14.6),
    source: 'Wall design CW-03; joints as logged, October 2026',
  },
]

/** Piezometers, each with its place, the level of its pipe top and how it is read. */
export const demoInstruments = (
  [
    ['P1', [372, 560], 'standpipe piezometer', 8.62, 8.35],
    ['P2', [300, 430], 'standpipe piezometer', 7.41, 7.16],
    ['P3', [350, 310], 'logger', 6.38, 6.05],
    ['P4', [500, 240], 'logger', 5.61, 5.42],
    ['P5', [606, 332], 'vibrating-wire', 5.9, 5.58],
    ['P6', [655, 445], 'logger', 6.29, 6.02],
    ['P7', [880, 430], 'logger', 6.11, 5.86],
    ['P8', [810, 520], 'standpipe piezometer', 6.94, 6.71],
    ['P9', [600, 600], 'logger', 7.83, 7.55],
    ['P10', [1000, 182], 'logger', 4.72, 4.48],
  ] as [string, PlanVertex, string, number, number][]
).map(([name, place, kind, pipeTop, ground]) => ({
  name,
  ...at(place),
  kind,
  levels: [
    {
      from: '2025-11-03T09:00:00Z',
      level: pipeTop,
      reason: 'First survey',
      source: 'Survey sheet SV-11, 3 November 2025',
    },
    // A lorry bent the standpipe: 0.30 m was cut off and the new top levelled the same day.
    ...(name === 'P2'
      ? [
          {
            from: '2026-05-12T10:30:00Z',
            level: Number((pipeTop - 0.3).toFixed(2)),
            reason: 'Casing cut by 0.30 m after damage, resurveyed',
            source: 'Survey sheet SV-19, 12 May 2026',
          },
        ]
      : []),
  ],
  groundLevel: metres(ground),
  responseTop: metres(-5),
  responseBase: metres(-8),
  installedOn: '2025-11-03',
  source: `Installation record IR-${name.slice(1).padStart(2, '0')}`,
}))

export const demoExtent = {
  xMin: atGrid([xMin, yMin])[0],
  xMax: atGrid([xMax, yMax])[0],
  yMin: atGrid([xMin, yMin])[1],
  yMax: atGrid([xMax, yMax])[1],
}

export const demoEstimates = [
  {
    result: 'Total abstraction',
    method: 'Equivalent well, Dupuit: Q = πK(H² − h²)/ln(R/r)',
    working:
      'K 16 m/d, aquifer base −14 m, H 15.7 m outside and 12.2 m under the dig, r = 48 m for the ring of wells, R = 450 m to the river and the north edge taken together.',
    value: 2190,
    unit: 'm³/d',
    computed: null,
    source: 'Dupuit (1863); Thiem (1906)',
  },
]
