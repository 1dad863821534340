import { type Profile, transmissivityAt } from './ground'

/**
 * Saturated flow in unconfined ground by its discharge potential: with T(h) = sum of k x min(h, top) - base over the
 * layers, the flow between two levels over a flat base is proportional to Phi(ha) - Phi(hb), Phi(h) the integral of T
 * (Girinskii 1946; for one layer K (h - base)^2 / 2, Dupuit 1863). Below a film of `film` over the base, T stays at
 * that film's value, so that a dry cell keeps a head (without meaning but for refilling) and its place in the system.
 */
export interface Potential {
  profile: Profile
  /** Conductivity a layer: kx, ky, or ones for the thickness itself. */
  k: number[]
  film: number
}

/** T(h) = dPhi/dh. */
export function slopeAt(potential: Potential, h: number): number {
  const { profile, k, film } = potential
  return transmissivityAt(profile, k, Math.max(h, (profile.base[0] as number) + film))
}

/** Phi(h), zero at the base of the lowest layer without a film. */
export function potentialAt(potential: Potential, h: number): number {
  const { profile, k } = potential
  const wet = (profile.base[0] as number) + potential.film
  if (h < wet) return potentialAt(potential, wet) - transmissivityAt(profile, k, wet) * (wet - h)
  let sum = 0
  for (let l = 0; l < k.length; l++) {
    const base = profile.base[l] as number
    if (h <= base) break
    const top = profile.top[l] as number
    const above = Math.min(h, top) - base
    sum += (k[l] as number) * (0.5 * above * above + (h > top ? above * (h - top) : 0))
  }
  return sum
}

/** The level h with Phi(h) = value. Phi is convex and rises, so Newton's steps from above come down to it. */
export function levelOfPotential(potential: Potential, value: number): number {
  const { profile, k, film } = potential
  const base = profile.base[0] as number
  const wet = base + film
  const wetValue = potentialAt(potential, wet)
  if (value <= wetValue) return wet - (wetValue - value) / slopeAt(potential, wet)
  const k0 = k[0] as number
  const first = base + Math.sqrt((2 * value) / k0)
  if (first <= (profile.top[0] as number)) return first
  let h = profile.top[0] as number
  h += (value - potentialAt(potential, h)) / slopeAt(potential, h)
  for (let step = 0; step < 100; step++) {
    const next = h - (potentialAt(potential, h) - value) / slopeAt(potential, h)
    if (!(Math.abs(next - h) > 1e-15 * (Math.abs(h) + Math.abs(next)))) return next
    h = next
  }
  return h
}

/**
 * Head at the face between two half cells in series, where both carry the same flow: the h with
 * (Phi_a(ha) - Phi_a(h)) / la = (Phi_b(h) - Phi_b(hb)) / lb. It lies between ha and hb. Newton's steps, kept inside by
 * bisection.
 */
export function levelAtFace(
  a: Potential,
  ha: number,
  la: number,
  b: Potential,
  hb: number,
  lb: number,
): number {
  let low = Math.min(ha, hb)
  let high = Math.max(ha, hb)
  const sum = potentialAt(a, ha) / la + potentialAt(b, hb) / lb
  let h = 0.5 * (low + high)
  for (let step = 0; step < 80; step++) {
    const excess = potentialAt(a, h) / la + potentialAt(b, h) / lb - sum
    if (excess > 0) high = h
    else low = h
    let next = h - excess / (slopeAt(a, h) / la + slopeAt(b, h) / lb)
    if (!(next > low && next < high)) next = 0.5 * (low + high)
    if (Math.abs(next - h) <= 1e-15 * (Math.abs(h) + high - low)) return next
    h = next
  }
  return h
}
