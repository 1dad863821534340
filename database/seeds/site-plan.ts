/**
 * The invented riverside site of the demo: what its plan drawing shows, and where. The drawing (site-plan.png, made by
 * scripts/make-demo-plan.ts) and the seeded rows both read these numbers, so that they lie on each other.
 * All in metres from the local origin, x to the east and y to the north; `atGrid` gives eastings and northings.
 */
export type PlanVertex = [number, number]

export const planOrigin = { easting: 482_000, northing: 105_000 }
export const planExtent = { xMin: 0, yMin: 0, xMax: 1200, yMax: 750 }

/** Eastings and northings of a vertex given from the local origin. */
export function atGrid([x, y]: PlanVertex): PlanVertex {
  return [planOrigin.easting + x, planOrigin.northing + y]
}

/** The picture: 1.25 pixels a metre, north up, column = 50 + 1.25 x, row = 987.5 - 1.25 y. */
export const planPicture = { file: 'site-plan.png', width: 1600, height: 1100 }

export function planPixel([x, y]: PlanVertex): { column: number; row: number } {
  return { column: 50 + 1.25 * x, row: 987.5 - 1.25 * y }
}

/** Survey stations marked on the picture: the two known points that place it. */
export const surveyStations = {
  ST1: [80, 670] as PlanVertex,
  ST2: [1120, 130] as PlanVertex,
}

/** Middle of the river, flowing east; it is 44 m wide. */
export const river: PlanVertex[] = [
  [0, 70],
  [150, 84],
  [300, 95],
  [450, 101],
  [600, 98],
  [750, 88],
  [900, 77],
  [1050, 72],
  [1200, 80],
]
export const riverWidth = 44

/** The dig: 90 m by 60 m about (600, 330). */
export const dig: PlanVertex[] = [
  [555, 300],
  [645, 300],
  [645, 360],
  [555, 360],
]

/** Cut-off wall on the west, north and east of the dig; the south side is left open for the ramp. */
export const cutOffWall: PlanVertex[] = [
  [545, 292],
  [545, 370],
  [655, 370],
  [655, 292],
]

export const basinA: PlanVertex[] = [
  [108, 522],
  [208, 528],
  [205, 588],
  [105, 582],
]
export const basinB: PlanVertex[] = [
  [238, 530],
  [338, 536],
  [335, 596],
  [235, 590],
]

export const worksBoundary: PlanVertex[] = [
  [428, 200],
  [806, 212],
  [800, 432],
  [428, 438],
]
export const worksYard: PlanVertex[] = [
  [690, 224],
  [792, 228],
  [789, 322],
  [690, 320],
]

export const railway: PlanVertex[] = [
  [0, 726],
  [400, 716],
  [800, 706],
  [1200, 700],
]

export interface PlanStreet {
  name: string
  width: number
  line: PlanVertex[]
}

export const streets: PlanStreet[] = [
  {
    name: 'Salters Road',
    width: 15,
    line: [
      [0, 642],
      [300, 634],
      [620, 628],
      [900, 626],
      [1200, 616],
    ],
  },
  {
    name: 'Quay Street',
    width: 12,
    line: [
      [400, 631],
      [402, 480],
      [396, 320],
      [398, 152],
    ],
  },
  {
    name: 'Chapel Row',
    width: 9,
    line: [
      [402, 468],
      [620, 466],
      [905, 470],
    ],
  },
  {
    name: 'Coopers Lane',
    width: 11,
    line: [
      [892, 626],
      [905, 470],
      [918, 310],
      [930, 146],
    ],
  },
  {
    name: 'The Strand',
    width: 12,
    line: [
      [0, 132],
      [200, 148],
      [398, 156],
      [600, 154],
      [800, 146],
      [930, 138],
      [1060, 134],
      [1200, 140],
    ],
  },
]

export interface PlanBuilding {
  name?: string
  /** Where the name is written, and its turn in degrees clockwise. */
  nameAt?: PlanVertex
  nameTurn?: number
  outline: PlanVertex[]
}

export const buildings: PlanBuilding[] = [
  ...terrace([560, 480], 9, 22, 18, 0.3),
  ...terrace([424, 480], 5, 21, 17, 0),
  { name: 'Chapel', nameAt: [864, 498], outline: cross([828, 502]) },
  { name: 'Maltings', nameAt: [262, 255], outline: block(190, 236, 150, 62, 2, [70, 34]) },
  { outline: block(210, 186, 84, 26, 2) },
  { outline: block(58, 186, 110, 40, 3, [50, 18]) },
  { outline: block(70, 270, 70, 48, 3) },
  ...terrace([64, 380], 8, 17, 15, 2),
  ...terrace([236, 388], 7, 17, 15, 1),
  ...terrace([66, 452], 6, 18, 14, 2),
  { name: 'Pump house', nameAt: [292, 490], outline: block(222, 478, 34, 22, 3) },
  { name: 'Ropewalk', nameAt: [980, 331], nameTurn: -86, outline: block(962, 226, 22, 210, -4) },
  { outline: block(1010, 196, 96, 44, -4, [40, 20]) },
  { outline: block(1022, 268, 70, 52, -4) },
  { outline: block(1016, 350, 104, 40, -3) },
  { name: 'Boat shed', nameAt: [1046, 163], outline: block(1016, 150, 60, 24, 3) },
  { name: 'School', nameAt: [1064, 514], outline: block(1012, 500, 112, 62, -2, [58, 30]) },
  ...terrace([930, 574], 3, 22, 18, -2),
  ...terrace([460, 550], 8, 24, 18, -0.5),
  ...terrace([690, 556], 7, 24, 18, -0.5),
  ...terrace([22, 663], 2, 20, 18, -1),
  ...terrace([214, 659], 6, 22, 17, -1.2),
  ...terrace([372, 654], 10, 22, 17, -1),
  { name: 'Goods shed', nameAt: [688, 669], outline: block(640, 655, 96, 30, -1) },
  ...terrace([780, 648], 7, 22, 17, -1),
  { outline: block(970, 642, 88, 32, -2) },
  { outline: block(1092, 636, 70, 34, -2) },
  { outline: block(440, 168, 60, 20, 0) },
  { outline: block(520, 168, 84, 20, 0) },
  { outline: block(640, 166, 110, 22, -1) },
  { outline: block(772, 164, 50, 20, -2) },
  { outline: block(838, 300, 44, 70, -4) },
  { outline: block(834, 210, 58, 56, -4) },
]

/** Spot levels of the ground, metres above datum. */
export const spotLevels: { at: PlanVertex; level: number }[] = [
  { at: [60, 610], level: 9.4 },
  { at: [362, 612], level: 8.8 },
  { at: [640, 606], level: 8.1 },
  { at: [1150, 590], level: 7.6 },
  { at: [362, 428], level: 6.2 },
  { at: [480, 320], level: 5.4 },
  { at: [714, 388], level: 5.7 },
  { at: [560, 226], level: 4.6 },
  { at: [868, 392], level: 5.9 },
  { at: [150, 350], level: 5.8 },
  { at: [330, 180], level: 4.1 },
  { at: [990, 480], level: 6.3 },
  { at: [880, 170], level: 4.0 },
  { at: [1150, 260], level: 4.8 },
]

function turned(corner: PlanVertex, local: PlanVertex[], degrees: number): PlanVertex[] {
  const cos = Math.cos((degrees * Math.PI) / 180)
  const sin = Math.sin((degrees * Math.PI) / 180)
  return local.map(([u, v]) => [corner[0] + u * cos - v * sin, corner[1] + u * sin + v * cos])
}

/** A rectangle by its south-west corner, size and turn in degrees; with a notch, its north-east corner is cut out. */
function block(
  x: number,
  y: number,
  width: number,
  depth: number,
  degrees: number,
  notch?: [number, number],
): PlanVertex[] {
  const local: PlanVertex[] = notch
    ? [
        [0, 0],
        [width, 0],
        [width, depth - notch[1]],
        [width - notch[0], depth - notch[1]],
        [width - notch[0], depth],
        [0, depth],
      ]
    : [
        [0, 0],
        [width, 0],
        [width, depth],
        [0, depth],
      ]
  return turned([x, y], local, degrees)
}

/** Houses wall to wall from the south-west corner on, every third one with a shallower front. */
function terrace(
  corner: PlanVertex,
  houses: number,
  frontage: number,
  depth: number,
  degrees: number,
): PlanBuilding[] {
  return Array.from({ length: houses }, (_, i) => {
    const deep = i % 3 === 1 ? depth - 3 : depth
    const [at] = turned(corner, [[i * frontage, 0]], degrees)
    return { outline: block(at?.[0] ?? 0, at?.[1] ?? 0, frontage, deep, degrees) }
  })
}

function cross([x, y]: PlanVertex): PlanVertex[] {
  return [
    [x - 7, y - 20],
    [x + 7, y - 20],
    [x + 7, y - 2],
    [x + 16, y - 2],
    [x + 16, y + 10],
    [x + 7, y + 10],
    [x + 7, y + 22],
    [x - 7, y + 22],
    [x - 7, y + 10],
    [x - 16, y + 10],
    [x - 16, y - 2],
    [x - 7, y - 2],
  ]
}
