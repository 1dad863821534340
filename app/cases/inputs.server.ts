import { listRows } from '~/book/rows.server'
import type { Material, Point, Zone } from '~/ground/ground'
import type { Project } from '~/projects/project'
import type { Boundary, RechargeZone, Wall, Well } from '~/water/water'
import type { Database } from '~database/connection.server'
import type { Case } from './case'
import type { CaseInputs } from './freeze'

/**
 * All rows that cases are made of. Call it inside a transaction when they must belong together: MariaDB's repeatable
 * read then answers from one snapshot. With `asKnownOn`, the rows that were in force then.
 */
export async function caseInputs(db: Database, project: Project, asKnownOn?: Date): Promise<CaseInputs> {
  const list = <Body>(kind: string) => listRows<Body>(db, project.id, kind, asKnownOn)
  return {
    project,
    materials: await list<Material>('material'),
    zones: await list<Zone>('zone'),
    points: await list<Point>('point'),
    wells: await list<Well>('well'),
    rechargeZones: await list<RechargeZone>('recharge zone'),
    boundaries: await list<Boundary>('boundary'),
    walls: await list<Wall>('wall'),
    cases: await list<Case>('case'),
  }
}
