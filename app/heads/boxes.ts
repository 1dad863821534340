/** A rectangle of a figure, turned about its middle; pixels, y down, angle in radians clockwise as seen. */
export interface Box {
  x: number
  y: number
  width: number
  height: number
  angle: number
}

export function boxOf(x: number, y: number, width: number, height: number, angle = 0): Box {
  return { x, y, width, height, angle }
}

/** The rectangle `width` wide about the straight piece from one pixel to another. */
export function boxAlong(from: readonly [number, number], to: readonly [number, number], width: number): Box {
  const length = Math.hypot(to[0] - from[0], to[1] - from[1])
  const angle = Math.atan2(to[1] - from[1], to[0] - from[0])
  return boxOf((from[0] + to[0]) / 2, (from[1] + to[1]) / 2, length + width, width, angle)
}

/** The corners, in order round the box. */
export function cornersOf(box: Box): [number, number][] {
  const cos = Math.cos(box.angle)
  const sin = Math.sin(box.angle)
  const ends: [number, number][] = [
    [-1, -1],
    [1, -1],
    [1, 1],
    [-1, 1],
  ]
  return ends.map(([across, down]): [number, number] => {
    const along = (across * box.width) / 2
    const over = (down * box.height) / 2
    return [box.x + along * cos - over * sin, box.y + along * sin + over * cos]
  })
}

/** Whether two boxes overlap: they do unless a side of one separates them (separating axis theorem). */
export function overlap(a: Box, b: Box): boolean {
  const reach = (Math.hypot(a.width, a.height) + Math.hypot(b.width, b.height)) / 2
  const dx = b.x - a.x
  const dy = b.y - a.y
  if (dx * dx + dy * dy >= reach * reach) return false
  return !separates(a, b, dx, dy) && !separates(b, a, dx, dy)
}

function separates(own: Box, other: Box, dx: number, dy: number): boolean {
  const turn = other.angle - own.angle
  const cos = Math.abs(Math.cos(turn))
  const sin = Math.abs(Math.sin(turn))
  const along = Math.abs(dx * Math.cos(own.angle) + dy * Math.sin(own.angle))
  const over = Math.abs(-dx * Math.sin(own.angle) + dy * Math.cos(own.angle))
  return (
    along >= (own.width + other.width * cos + other.height * sin) / 2 ||
    over >= (own.height + other.width * sin + other.height * cos) / 2
  )
}

/** Whether a box lies inside an upright rectangle. */
export function liesWithin(
  box: Box,
  rectangle: { left: number; top: number; width: number; height: number },
): boolean {
  return cornersOf(box).every(
    ([x, y]) =>
      x >= rectangle.left &&
      x <= rectangle.left + rectangle.width &&
      y >= rectangle.top &&
      y <= rectangle.top + rectangle.height,
  )
}

/**
 * Width of a line of type in Source Sans 3, in pixels, from its advance widths in classes (em/1000): good to a few per
 * cent, which is what placing labels needs; drawing measures nothing.
 */
export function typeWidth(text: string, size: number, bold = false): number {
  let width = 0
  for (const letter of text) {
    if (/[0-9+−=±]/.test(letter)) width += 497
    else if (/[ .,:;'|ilj·!\u202f]/.test(letter)) width += 245
    else if (/[ftr()[\]/-]/.test(letter)) width += 330
    else if (/[mwMW]/.test(letter)) width += 810
    else if (/[A-Z]/.test(letter)) width += 590
    else width += 510
  }
  return (width * size * (bold ? 1.05 : 1)) / 1000
}
