import { useCallback, useEffect, useState } from 'react'
import { useChartTheme } from '~/components/chart-colours'
import { ContourChart } from '~/components/contour-chart'
import { Notice } from '~/components/notice'
import type { HeadField } from '~/heads/field'
import {
  headsPicture,
  type PictureFeatures,
  type PictureInput,
  pictureLayout,
  type ResidualMark,
} from '~/heads/picture'
import { decodeHeads } from '~/solver/heads-buffer'

interface ResidualPlanProps {
  /** Address of the run's head buffer. */
  headsUrl: string
  marks: readonly ResidualMark[]
  features: PictureFeatures
  converged: boolean
  unit: string
  datum: string
}

/** Residuals at their instruments over the heads of the run, drawn quietly. Fetches the head field itself. */
export default function ResidualPlan({
  headsUrl,
  marks,
  features,
  converged,
  unit,
  datum,
}: ResidualPlanProps) {
  const [field, setField] = useState<HeadField | null>(null)
  const [failed, setFailed] = useState(false)
  const theme = useChartTheme()
  useEffect(() => {
    const stop = new AbortController()
    setField(null)
    setFailed(false)
    fetchField(headsUrl, stop.signal).then(setField, (error: unknown) => {
      if (!stop.signal.aborted) {
        console.warn('The head field did not arrive:', error)
        setFailed(true)
      }
    })
    return () => stop.abort()
  }, [headsUrl])
  const draw = useCallback(
    (width: number) => {
      const input: PictureInput = {
        ...(field as HeadField),
        field: 'residual',
        features,
        residuals: marks,
        unit,
        datum,
        converged,
      }
      const options = { width, theme }
      return { option: headsPicture(input, options), height: pictureLayout(input, options).height }
    },
    [field, features, marks, unit, datum, converged, theme],
  )
  if (failed)
    return <Notice tone="warn" title="The head field could not be fetched. Reload the page to try again." />
  if (!field) return <p className="h-96 text-flint-2">Drawing …</p>
  return (
    <ContourChart
      draw={draw}
      label={`Plan with the residuals of ${marks.length} instruments; the sheet holds the figures`}
    />
  )
}

async function fetchField(url: string, signal: AbortSignal): Promise<HeadField> {
  const response = await fetch(url, { signal })
  if (!response.ok) throw new Error(`The server answered ${response.status}.`)
  const { grid, heads } = decodeHeads(await response.arrayBuffer())
  return { xEdges: grid.xEdges, yEdges: grid.yEdges, heads }
}
