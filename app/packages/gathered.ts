import type { Assumption, Basis, Standard } from '~/basis/basis'
import type { SectionKey, SectionState } from '~/book/sections'
import type { Estimate } from '~/checks/estimate'
import type { FitStatistics } from '~/fit/statistics'
import type { Material, PlanImage, Point, Zone } from '~/ground/ground'
import type { Acceptance } from '~/heads/acceptance'
import type { Instrument, ReferenceLevel } from '~/readings/instrument'
import type { Model } from '~/solver/model'
import type { Result } from '~/solver/result'
import type { ProjectUnits } from '~/units'
import type { Boundary, RechargeZone, Wall, Well } from '~/water/water'
import type { PackageStatus, Signature } from './title-block'

/** A row with the id that other rows refer to. */
export type Held<Body> = Body & { id: string }

export interface GatheredRun {
  number: number
  caseName: string
  inputSha256: string
  headsSha256: string
  by: string
  startedAt: string
  endedAt: string
  model: Model
  result: Result
  /** Of its warnings, by whom and why; not in packages gathered before there were any. */
  acceptances?: Acceptance[]
}

export interface GatheredInstrument extends Held<Instrument> {
  referenceLevels: Held<ReferenceLevel>[]
  readings: number
  first: string | null
  last: string | null
  lastHead: number | null
}

export interface GatheredImport {
  file: string
  sha256: string
  rows: number
  added: number
  committedAt: string
  by: string
}

export interface GatheredFitLine {
  name: string
  at: string | null
  measured: number | null
  modelled: number | null
  residual: number | null
  why: string | null
}

/** What the body of a package is drawn from. Its SHA-256 is the input hash that signatures cover. */
export interface GatheredContent {
  format: 'lavant-package'
  version: 1
  project: {
    number: string
    title: string
    client: string
    calcReference: string
    crsEpsg: number
    verticalDatum: string
    timeZone: string
    units: ProjectUnits
  }
  basis: Basis | null
  assumptions: Held<Assumption>[]
  standards: Held<Standard>[]
  materials: Held<Material>[]
  zones: Held<Zone>[]
  points: Held<Point>[]
  planImage: (PlanImage & { sha256: string }) | null
  wells: Held<Well>[]
  rechargeZones: Held<RechargeZone>[]
  boundaries: Held<Boundary>[]
  walls: Held<Wall>[]
  run: GatheredRun
  against: GatheredRun | null
  instruments: GatheredInstrument[]
  imports: GatheredImport[]
  fit: { date: string | null; lines: GatheredFitLine[]; statistics: FitStatistics | null }
  estimates: Held<Estimate>[]
}

/** The cover: changes as people sign, so it is no part of what they sign. */
export interface GatheredCover {
  revision: string
  status: PackageStatus
  purpose: string
  reason: string
  madeBy: string
  madeAt: string
  issuedAt: string | null
  distribution: string
  inputSha256: string
  signatures: Signature[]
  revisions: { revision: string; status: PackageStatus; reason: string; issuedAt: string | null }[]
  sections: { key: SectionKey; state: SectionState; checkedBy: string | null; checkedAt: string | null }[]
  address: string
}

/** Passed to the drawing thread; the head fields travel beside it as buffers. */
export interface DrawRequest {
  content: GatheredContent
  cover: GatheredCover
  heads: Uint8Array
  againstHeads: Uint8Array | null
}
