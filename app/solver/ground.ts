import type { Grid } from './grid'
import { centresOf } from './grid'
import type { Material, Model, Surface } from './model'
import { ModelError, requireFinite, requirePositive } from './model-error'
import { checkedPolygon, visitCellsInside } from './polygon'
import { surfaceThrough } from './surface'

/**
 * The ground under one or more cells: layers from the bottom up, each with base and top level (top may be infinite in
 * unconfined flow) and conductivity along x and y. Levels are above the model's datum until `shiftLevels` is applied.
 */
export interface Profile {
  base: number[]
  top: number[]
  kx: number[]
  ky: number[]
  /** The tensor's cross term; 0 where the principal directions run along the axes. */
  kxy: number[]
  /** Index into the model's materials, a layer. */
  material: number[]
}

export interface GroundOnGrid {
  /** 1 where ground covers the cell's centre. */
  active: Uint8Array
  /** Index into `profiles`, -1 outside. */
  profileOf: Int32Array
  profiles: Profile[]
}

/** Which profile lies under each cell. A later entry replaces earlier ones; no entry leaves the cell outside. */
export function groundOnGrid(model: Model, grid: Grid): GroundOnGrid {
  const conductivities = new Map<string, AxisConductivity & { index: number }>()
  model.materials.forEach((material, index) => {
    if (conductivities.has(material.name)) {
      throw new ModelError(`materials[${index}].name`, `the name "${material.name}" is used twice`)
    }
    conductivities.set(material.name, {
      ...conductivityOf(material, `materials[${index}]`, model.flow),
      index,
    })
  })
  const count = grid.columns * grid.rows
  const active = new Uint8Array(count)
  const profileOf = new Int32Array(count).fill(-1)
  const profiles: Profile[] = []
  const xCentres = centresOf(grid.xEdges)
  const yCentres = centresOf(grid.yEdges)
  if (model.ground.length === 0) throw new ModelError('ground', 'there is no ground: give at least one entry')
  model.ground.forEach((entry, index) => {
    const path = `ground[${index}]`
    const profileAt = layersOf(model, entry, path, conductivities)
    const level = profileAt.constant ? profiles.push(profileAt.at(0, 0)) - 1 : -1
    function cover(cell: number): void {
      active[cell] = 1
      if (level >= 0) profileOf[cell] = level
      else {
        const j = Math.floor(cell / grid.columns)
        const i = cell - j * grid.columns
        profileOf[cell] = profiles.push(profileAt.at(xCentres[i] as number, yCentres[j] as number)) - 1
      }
    }
    if (entry.polygon) visitCellsInside(grid, checkedPolygon(entry.polygon, `${path}.polygon`), cover)
    else for (let cell = 0; cell < count; cell++) cover(cell)
  })
  if (!active.includes(1)) throw new ModelError('ground', 'no ground entry covers the centre of any cell')
  return { active, profileOf, profiles }
}

/** Conductivity as the grid's axes see it. */
interface AxisConductivity {
  kx: number
  ky: number
  kxy: number
}

function conductivityOf(material: Material, path: string, flow: Model['flow']): AxisConductivity {
  const k1 = requirePositive(material.kx, `${path}.kx`)
  const k2 = requirePositive(material.ky, `${path}.ky`)
  const angle = requireFinite(material.angle ?? 0, `${path}.angle`)
  if (k1 === k2 || angle % 180 === 0) return { kx: k1, ky: k2, kxy: 0 }
  if (angle % 90 === 0) return { kx: k2, ky: k1, kxy: 0 }
  if (flow === 'free surface') {
    throw new ModelError(
      `${path}.angle`,
      `with a free surface, principal directions at ${angle} degrees to the grid are not computed; 0 and 90 are`,
    )
  }
  if (Math.max(k1, k2) > mostAnisotropy * Math.min(k1, k2)) {
    throw new ModelError(
      `${path}.angle`,
      `conductivities at ${angle} degrees to the grid may differ by a factor of ${mostAnisotropy} at most`,
    )
  }
  const radians = (angle * Math.PI) / 180
  const cosine = Math.cos(radians)
  const sine = Math.sin(radians)
  return {
    kx: k1 * cosine * cosine + k2 * sine * sine,
    ky: k1 * sine * sine + k2 * cosine * cosine,
    kxy: (k1 - k2) * sine * cosine,
  }
}

/** Beyond this the grid resolves nothing of flow askew to it. */
const mostAnisotropy = 1000

interface ProfileMaker {
  constant: boolean
  at: (x: number, y: number) => Profile
}

function layersOf(
  model: Model,
  entry: Model['ground'][number],
  path: string,
  conductivities: Map<string, AxisConductivity & { index: number }>,
): ProfileMaker {
  if (entry.layers && (entry.material !== undefined || entry.base !== undefined || entry.top !== undefined)) {
    throw new ModelError(path, 'give either layers, or material, base and top')
  }
  if (model.kind === 'section') return sectionGround(entry, path, conductivities)
  const given = entry.layers ?? [{ material: entry.material ?? '', base: entry.base, top: entry.top }]
  if (given.length === 0) throw new ModelError(`${path}.layers`, 'there is no layer')
  // The file lists layers from the top down; a profile holds them from the bottom up.
  const layers = given
    .map((layer, index) => {
      const place = entry.layers ? `${path}.layers[${index}]` : path
      const conductivity = conductivities.get(layer.material)
      if (!conductivity) throw new ModelError(`${place}.material`, `there is no material "${layer.material}"`)
      const open = layer.top === undefined && model.flow === 'unconfined' && index === 0
      if (layer.top === undefined && !open) throw new ModelError(`${place}.top`, 'a top level is needed here')
      if (layer.base === undefined) throw new ModelError(`${place}.base`, 'a base level is needed')
      return {
        place,
        conductivity,
        base: levelOf(layer.base, `${place}.base`),
        top: layer.top === undefined ? openTop : levelOf(layer.top, `${place}.top`),
      }
    })
    .reverse()
  function at(x: number, y: number): Profile {
    const profile: Profile = { base: [], top: [], kx: [], ky: [], kxy: [], material: [] }
    let below = Number.NEGATIVE_INFINITY
    for (const layer of layers) {
      const base = layer.base.at(x, y)
      const top = layer.top.at(x, y)
      const where = layer.base.constant && layer.top.constant ? '' : ` at (${x}, ${y})`
      if (base >= top) {
        throw new ModelError(layer.place, `the base ${base} is not below the top ${top}${where}`)
      }
      if (base < below - 1e-9 * Math.max(1, Math.abs(below))) {
        throw new ModelError(
          layer.place,
          `its base ${base} lies below the top ${below} of the layer under it${where}`,
        )
      }
      below = top
      profile.base.push(base)
      profile.top.push(top)
      profile.kx.push(layer.conductivity.kx)
      profile.ky.push(layer.conductivity.ky)
      profile.kxy.push(layer.conductivity.kxy)
      profile.material.push(layer.conductivity.index)
    }
    return profile
  }
  return { constant: layers.every((layer) => layer.base.constant && layer.top.constant), at }
}

/** Ground of a vertical section: one unit wide, so that its transmissivity is its conductivity. */
function sectionGround(
  entry: Model['ground'][number],
  path: string,
  conductivities: Map<string, AxisConductivity & { index: number }>,
): ProfileMaker {
  for (const field of ['base', 'top', 'layers'] as const) {
    if (entry[field] === undefined) continue
    throw new ModelError(
      `${path}.${field}`,
      'belongs to a plan; in a vertical section polygons say where a material lies',
    )
  }
  const conductivity = conductivities.get(entry.material ?? '')
  if (!conductivity) {
    throw new ModelError(`${path}.material`, `there is no material "${entry.material ?? ''}"`)
  }
  const { kx, ky, kxy, index } = conductivity
  const profile: Profile = { base: [0], top: [1], kx: [kx], ky: [ky], kxy: [kxy], material: [index] }
  return { constant: true, at: () => profile }
}

interface Level {
  constant: boolean
  at: (x: number, y: number) => number
}

const openTop: Level = { constant: true, at: () => Number.POSITIVE_INFINITY }

function levelOf(value: number | Surface, path: string): Level {
  if (typeof value === 'number') {
    const level = requireFinite(value, path)
    return { constant: true, at: () => level }
  }
  return { constant: false, at: surfaceThrough(value.xyz, `${path}.xyz`) }
}

/** Moves every level of the profiles down by `reference`, in place. */
export function shiftLevels(profiles: Profile[], reference: number): void {
  for (const profile of profiles) {
    profile.base = profile.base.map((level) => level - reference)
    profile.top = profile.top.map((level) => level - reference)
  }
}

/** Saturated thickness at head `h`. */
export function thicknessAt(profile: Profile, h: number): number {
  let thickness = 0
  for (let l = 0; l < profile.base.length; l++) {
    const base = profile.base[l] as number
    const top = profile.top[l] as number
    if (h > base) thickness += Math.min(h, top) - base
  }
  return thickness
}

/** Sum over the layers of k x saturated thickness at head `h`. `k` is the profile's kx, ky or any list of its length. */
export function transmissivityAt(profile: Profile, k: number[], h: number): number {
  let sum = 0
  for (let l = 0; l < profile.base.length; l++) {
    const base = profile.base[l] as number
    const top = profile.top[l] as number
    if (h > base) sum += (k[l] as number) * (Math.min(h, top) - base)
  }
  return sum
}
