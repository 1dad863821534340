import type { Discretised } from './discretise'
import type { Profile } from './ground'
import { ModelError, requireNotNegative, requirePositive } from './model-error'
import { potentialAt } from './saturated'

/** What one profile stores, by layer from the bottom up: specific storage [1/length] and specific yield [-]. */
export interface ProfileStorage {
  profile: Profile
  specificStorage: number[]
  specificYield: number[]
  /** Confined: specific storage x thickness, whatever the head. */
  full: number
}

/** Below the film over its base a cell keeps this share of its yield, so that a dry cell's head has a place to go. */
const dryShare = 1e-4

/**
 * The storage of every profile. Throws ModelError, with the material's path, where a material of the ground lacks
 * what its flow needs: specific storage in confined flow and vertical sections, specific yield in unconfined flow.
 */
export function storageOf(d: Discretised): ProfileStorage[] {
  const { materials } = d.model
  return d.profiles.map((profile) => {
    const specificStorage = profile.material.map((index) => {
      const path = `materials[${index}].specificStorage`
      const given = materials[index]?.specificStorage
      if (d.unconfined) return given === undefined ? 0 : requireNotNegative(given, path)
      if (given === undefined) {
        throw new ModelError(path, `"${materials[index]?.name}" needs a specific storage in transient flow`)
      }
      return requirePositive(given, path)
    })
    const specificYield = profile.material.map((index) => {
      if (!d.unconfined) return 0
      const path = `materials[${index}].specificYield`
      const given = materials[index]?.specificYield
      if (given === undefined) {
        throw new ModelError(path, `"${materials[index]?.name}" needs a specific yield in transient flow`)
      }
      if (requirePositive(given, path) > 1) throw new ModelError(path, 'is a share of the volume: at most 1')
      return given
    })
    const capped = profile.top.findIndex((top, layer) => {
      return Number.isFinite(top) && d.unconfined && (specificStorage[layer] as number) === 0
    })
    if (capped >= 0 && !layerAbove(profile, capped)) {
      const index = profile.material[capped] as number
      throw new ModelError(
        `materials[${index}].specificStorage`,
        `"${materials[index]?.name}" has a top: once full it needs a specific storage in transient flow`,
      )
    }
    let full = 0
    for (let l = 0; l < profile.base.length; l++) {
      full += (specificStorage[l] as number) * ((profile.top[l] as number) - (profile.base[l] as number))
    }
    return { profile, specificStorage, specificYield, full }
  })
}

function layerAbove(profile: Profile, layer: number): boolean {
  return layer + 1 < profile.base.length
}

/**
 * Water stored per unit of plan area of unconfined ground at head `h`, from an arbitrary zero: the yield of what is wet
 * and the integral of specific storage x saturated thickness; continuous at the top.
 */
export function storedAt(storage: ProfileStorage, film: number, h: number): number {
  const { profile, specificStorage, specificYield } = storage
  const wet = (profile.base[0] as number) + film
  const level = Math.max(h, wet)
  let sum = potentialAt({ profile, k: specificStorage, film: 0 }, level)
  for (let l = 0; l < profile.base.length; l++) {
    const base = profile.base[l] as number
    if (level <= base) break
    sum += (specificYield[l] as number) * (Math.min(level, profile.top[l] as number) - base)
  }
  return h < wet ? sum - dryShare * (specificYield[0] as number) * (wet - h) : sum
}

/** d stored / d h, for `storedAt`. */
export function storageSlopeAt(storage: ProfileStorage, film: number, h: number): number {
  const { profile, specificStorage, specificYield } = storage
  if (h < (profile.base[0] as number) + film) return dryShare * (specificYield[0] as number)
  let slope = 0
  for (let l = 0; l < profile.base.length; l++) {
    const base = profile.base[l] as number
    const top = profile.top[l] as number
    if (h <= base) break
    slope += (specificStorage[l] as number) * (Math.min(h, top) - base)
    if (h < top) slope += specificYield[l] as number
  }
  return slope
}
