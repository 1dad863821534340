import { type Oklch, toHex } from './ramp'

export type FigureTheme = 'light' | 'dark' | 'print'

/** Colours of a figure besides its ramp; six-digit hex, since PDF drawing knows no other notation. */
export interface Palette {
  paper: string
  ink: string
  quiet: string
  rule: string
  /** Lines over the field, and what sets them off from it. */
  line: string
  casing: string
  water: string
  flux: string
  /** Symbols are light with a dark edge: they show on both ends of every ramp. */
  face: string
  edge: string
  recharge: string
  alarm: string
  chip: string
  chipInk: string
  chipOpacity: number
}

const hex = (l: number, c: number, h: number) => toHex({ l, c, h })

const light: Palette = {
  paper: hex(0.988, 0.005, 95),
  ink: hex(0.24, 0.015, 240),
  quiet: hex(0.45, 0.018, 240),
  rule: hex(0.8, 0.013, 95),
  line: hex(0.22, 0.02, 240),
  casing: hex(1, 0, 0),
  water: hex(0.43, 0.095, 225),
  flux: hex(0.5, 0.115, 60),
  face: hex(1, 0, 0),
  edge: hex(0.22, 0.02, 240),
  recharge: hex(0.55, 0.1, 225),
  alarm: hex(0.5, 0.15, 28),
  chip: hex(1, 0, 0),
  chipInk: hex(0.22, 0.02, 240),
  chipOpacity: 0.82,
}

export const palettes: Record<FigureTheme, Palette> = {
  light,
  print: { ...light, paper: hex(1, 0, 0), ink: hex(0.2, 0.01, 240), quiet: hex(0.38, 0.015, 240) },
  dark: {
    paper: hex(0.21, 0.012, 240),
    ink: hex(0.94, 0.008, 95),
    quiet: hex(0.76, 0.012, 95),
    rule: hex(0.42, 0.015, 240),
    line: hex(0.96, 0.008, 95),
    casing: hex(0.2, 0.02, 240),
    water: hex(0.86, 0.07, 210),
    flux: hex(0.86, 0.11, 80),
    face: hex(0.98, 0.006, 95),
    edge: hex(0.2, 0.02, 240),
    recharge: hex(0.55, 0.1, 225),
    alarm: hex(0.74, 0.14, 30),
    chip: hex(0.22, 0.015, 240),
    chipInk: hex(0.97, 0.006, 95),
    chipOpacity: 0.8,
  },
}

/** A fill of the field in a theme: at night the whole ramp is a step darker, its order and spacing kept. */
export function inTheme(fill: Oklch, theme: FigureTheme): Oklch {
  return theme === 'dark' ? { ...fill, l: fill.l * 0.86 + 0.02 } : fill
}
