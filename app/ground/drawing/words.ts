import type { DrawnKind } from './drawn-feature'

/** Names of what can be drawn, as a toolbar and a form show them. */
export const kindWords: Record<DrawnKind, string> = {
  well: 'Well',
  'recharge zone': 'Recharge zone',
  boundary: 'Boundary',
  wall: 'Cut-off wall',
  zone: 'Zone',
  point: 'Point',
  instrument: 'Instrument',
  extent: 'Extent',
}
