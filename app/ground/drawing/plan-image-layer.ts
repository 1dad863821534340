import ImageLayer from 'ol/layer/Image.js'
import type Projection from 'ol/proj/Projection.js'
import ImageCanvas from 'ol/source/ImageCanvas.js'
import type { PlanImage } from '~/ground/ground'
import { planImagePlacement } from '~/ground/plan-image'
import { type Palette, paint } from './palette'

export interface ShownPlanImage {
  url: string
  width: number
  height: number
  control: PlanImage['control']
  opacity: number
}

/** A white sheet with dark lines, as opposed to a photograph. */
function isLineDrawing(picture: HTMLImageElement): boolean {
  const canvas = document.createElement('canvas')
  canvas.width = 32
  canvas.height = 32
  const context = canvas.getContext('2d', { willReadFrequently: true })
  if (!context) return false
  context.fillStyle = '#fff'
  context.fillRect(0, 0, 32, 32)
  context.drawImage(picture, 0, 0, 32, 32)
  const { data } = context.getImageData(0, 0, 32, 32)
  let sum = 0
  for (let i = 0; i < data.length; i += 4) {
    sum += (data[i] as number) + (data[i + 1] as number) + (data[i + 2] as number)
  }
  return sum / (3 * 255 * 1024) > 0.8
}

/**
 * The plan image as a layer: the picture is drawn through its placement at the scale of the view, turned as its known
 * points turn it. A drawing
 * on white paper takes the tone of the page, by night in reverse, so that symbols and labels over it stay readable.
 */
export function planImageLayer(
  image: ShownPlanImage,
  projection: Projection,
  palette: () => Palette,
): ImageLayer<ImageCanvas> {
  const picture = new Image()
  let lineDrawing = false
  const placement = planImagePlacement(image.control)
  const source = new ImageCanvas({
    projection,
    ratio: 1.5,
    canvasFunction: (extent, _resolution, _pixelRatio, size) => {
      const canvas = document.createElement('canvas')
      canvas.width = Math.max(1, Math.round(size[0] as number))
      canvas.height = Math.max(1, Math.round(size[1] as number))
      const context = canvas.getContext('2d')
      if (!context || !picture.complete || picture.naturalWidth === 0) return canvas
      const [left, bottom, right, top] = extent as [number, number, number, number]
      const across = canvas.width / (right - left)
      const down = canvas.height / (top - bottom)
      context.setTransform(
        placement.xColumn * across,
        -placement.yColumn * down,
        placement.xRow * across,
        -placement.yRow * down,
        (placement.xOrigin - left) * across,
        (top - placement.yOrigin) * down,
      )
      context.imageSmoothingQuality = 'high'
      context.drawImage(picture, 0, 0, image.width, image.height)
      if (lineDrawing) {
        const { dark, chalk } = palette()
        const over = (operation: GlobalCompositeOperation, colour: string) => {
          context.globalCompositeOperation = operation
          context.fillStyle = colour
          context.fillRect(0, 0, image.width, image.height)
        }
        if (dark) over('difference', '#fff')
        over(dark ? 'lighten' : 'darken', paint(chalk))
      }
      return canvas
    },
  })
  picture.onload = () => {
    lineDrawing = isLineDrawing(picture)
    source.changed()
  }
  picture.src = image.url
  return new ImageLayer({ source, opacity: image.opacity, zIndex: -1 })
}
