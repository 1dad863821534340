import { useEffect, useState } from 'react'

export type ChartTheme = 'light' | 'dark' | 'print'

/** Colours in force: the person's choice or the system's, and ink on paper while the page is being printed. */
export function useChartTheme(): ChartTheme {
  const [theme, setTheme] = useState<ChartTheme>('light')
  useEffect(() => {
    const dark = matchMedia('(prefers-color-scheme: dark)')
    const root = document.documentElement
    const read = () => {
      const chosen = root.dataset.theme
      setTheme(chosen === 'dark' || (chosen !== 'light' && dark.matches) ? 'dark' : 'light')
    }
    const toPaper = () => setTheme('print')
    read()
    const observer = new MutationObserver(read)
    observer.observe(root, { attributes: true, attributeFilter: ['data-theme'] })
    dark.addEventListener('change', read)
    window.addEventListener('beforeprint', toPaper)
    window.addEventListener('afterprint', read)
    return () => {
      observer.disconnect()
      dark.removeEventListener('change', read)
      window.removeEventListener('beforeprint', toPaper)
      window.removeEventListener('afterprint', read)
    }
  }, [])
  return theme
}

/** Colours of the present theme as six-digit hex, which every renderer understands. */
export interface ChartColours {
  text: string
  quiet: string
  rule: string
  mark: string
  paper: string
  alarm: string
  warn: string
}

const variables: Record<keyof ChartColours, string> = {
  text: '--flint',
  quiet: '--flint-2',
  rule: '--rule',
  mark: '--bourne',
  paper: '--chalk',
  alarm: '--madder',
  warn: '--ochre',
}

/** The browser turns any CSS colour into pixels; a pixel is read back as hex. */
function hexOf(css: string, context: CanvasRenderingContext2D): string {
  context.fillStyle = css
  context.fillRect(0, 0, 1, 1)
  const [r = 0, g = 0, b = 0] = context.getImageData(0, 0, 1, 1).data
  return `#${[r, g, b].map((part) => part.toString(16).padStart(2, '0')).join('')}`
}

function readColours(): ChartColours | null {
  const context = document.createElement('canvas').getContext('2d', { willReadFrequently: true })
  if (!context) return null
  const style = getComputedStyle(document.documentElement)
  return Object.fromEntries(
    Object.entries(variables).map(([name, variable]) => [
      name,
      hexOf(style.getPropertyValue(variable), context),
    ]),
  ) as unknown as ChartColours
}

/** Colours of the theme in force, null on the server; they follow when the theme changes. */
export function useChartColours(): ChartColours | null {
  const theme = useChartTheme()
  const [colours, setColours] = useState<ChartColours | null>(null)
  // biome-ignore lint/correctness/useExhaustiveDependencies: the theme decides what the variables say.
  useEffect(() => setColours(readColours()), [theme])
  return colours
}
