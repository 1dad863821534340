/** Colours of the page as a canvas needs them: red, green and blue from 0 to 255. */
export type Paint = [red: number, green: number, blue: number]

const names = [
  'chalk',
  'chalk-2',
  'flint',
  'flint-2',
  'rule',
  'bourne',
  'bourne-2',
  'madder',
  'ochre',
  'moss',
] as const
type ColourName = (typeof names)[number]

export type Palette = Record<ColourName, Paint> & { dark: boolean }

/**
 * The theme's colours in force about an element. They are declared in OKLCH, which a drawing library doesn't parse, so
 * each is painted once on a small canvas and read back.
 */
export function readPalette(element: Element): Palette {
  const style = getComputedStyle(element)
  const canvas = document.createElement('canvas')
  canvas.width = 1
  canvas.height = 1
  const context = canvas.getContext('2d', { willReadFrequently: true })
  if (!context) throw new Error('This browser gives no canvas to draw on.')
  const painted = (name: ColourName): Paint => {
    context.fillStyle = style.getPropertyValue(`--${name}`).trim()
    context.fillRect(0, 0, 1, 1)
    const [red = 0, green = 0, blue = 0] = context.getImageData(0, 0, 1, 1).data
    return [red, green, blue]
  }
  const colours = Object.fromEntries(names.map((name) => [name, painted(name)])) as Record<ColourName, Paint>
  const [red, green, blue] = colours.chalk
  return { ...colours, dark: (red + green + blue) / 3 < 128 }
}

export function paint([red, green, blue]: Paint, alpha = 1): string {
  return `rgba(${red},${green},${blue},${alpha})`
}

/** Calls back whenever the theme changes: by the page's switch, by the system, or for print. Returns how to stop. */
export function watchTheme(changed: () => void): () => void {
  const observer = new MutationObserver(changed)
  observer.observe(document.documentElement, { attributes: true, attributeFilter: ['data-theme'] })
  const media = ['(prefers-color-scheme: dark)', 'print'].map((query) => matchMedia(query))
  for (const query of media) query.addEventListener('change', changed)
  return () => {
    observer.disconnect()
    for (const query of media) query.removeEventListener('change', changed)
  }
}
