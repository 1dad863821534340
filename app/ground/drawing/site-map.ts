import Collection from 'ol/Collection.js'
import {
  altKeyOnly,
  focus,
  platformModifierKeyOnly,
  primaryAction,
  singleClick,
} from 'ol/events/condition.js'
import Feature from 'ol/Feature.js'
import type Geometry from 'ol/geom/Geometry.js'
import LineString from 'ol/geom/LineString.js'
import Point from 'ol/geom/Point.js'
import Polygon from 'ol/geom/Polygon.js'
import DragPan from 'ol/interaction/DragPan.js'
import Draw, { createBox } from 'ol/interaction/Draw.js'
import type Interaction from 'ol/interaction/Interaction.js'
import KeyboardPan from 'ol/interaction/KeyboardPan.js'
import KeyboardZoom from 'ol/interaction/KeyboardZoom.js'
import Modify from 'ol/interaction/Modify.js'
import MouseWheelZoom from 'ol/interaction/MouseWheelZoom.js'
import PinchZoom from 'ol/interaction/PinchZoom.js'
import Snap from 'ol/interaction/Snap.js'
import Translate from 'ol/interaction/Translate.js'
import Kinetic from 'ol/Kinetic.js'
import VectorLayer from 'ol/layer/Vector.js'
import OlMap from 'ol/Map.js'
import type MapBrowserEvent from 'ol/MapBrowserEvent.js'
import Projection from 'ol/proj/Projection.js'
import VectorSource from 'ol/source/Vector.js'
import Style from 'ol/style/Style.js'
import View from 'ol/View.js'
import type { Vertex } from '~/book/field'
import { lineLength } from '~/book/field'
import {
  type DrawnFeature,
  type DrawnGeometry,
  type DrawnKind,
  decimalsAt,
  type Extent,
  geometryProblem,
  movedVertices,
  roundedVertices,
  shapeOf,
  verticesOf,
} from './drawn-feature'
import { readPalette, watchTheme } from './palette'
import { type LabelledLine, type PlacedLabels, placeLabels, symbolScale } from './place-labels'
import { planImageLayer, type ShownPlanImage } from './plan-image-layer'
import { drawnOf, handle, type Look, measuredStyle, sketchStyles, stylesFor, symbolReach } from './symbols'

export type SiteTool =
  | { name: 'select' }
  | { name: 'move' }
  | { name: 'reshape' }
  | { name: 'measure' }
  | { name: 'draw'; kind: DrawnKind }

/** What the map tells the page. */
export interface SiteMapEvents {
  onSelect: (id: string | null) => void
  onHover: (id: string | null) => void
  onChange: (id: string, geometry: DrawnGeometry) => void
  onDraw: (kind: DrawnKind, geometry: DrawnGeometry) => void
  /** Where the pointer is, with the decimals that make sense at this scale; null when it leaves. */
  onPointer: (at: Vertex | null, decimals: number) => void
  /** Coordinate units per pixel, at each change of the view. */
  onScale: (resolution: number) => void
  /** Length of the measured line and of its last stretch; null when there is none. */
  onMeasure: (length: number | null, stretch: number) => void
  /** Why what was drawn cannot stand. */
  onTrouble: (message: string) => void
}

export interface SiteMap {
  setFeatures: (features: readonly DrawnFeature[]) => void
  setChoice: (selectedId: string | null, hoveredId: string | null) => void
  setTool: (tool: SiteTool) => void
  setPlanImage: (image: ShownPlanImage | null) => void
  /** Brings this rectangle into view. */
  show: (extent: Extent) => void
  zoom: (steps: number) => void
  /** Takes back the line in hand. True when there was one. */
  abandon: () => boolean
  /** Takes back the last vertex of the line in hand. */
  stepBack: () => void
  destroy: () => void
}

function geometryFrom(geometry: DrawnGeometry): Geometry {
  switch (geometry.type) {
    case 'point':
      return new Point(geometry.at)
    case 'line':
      return new LineString(geometry.vertices)
    case 'polygon':
      return new Polygon([[...geometry.vertices, geometry.vertices[0] as Vertex]])
  }
}

function drawnGeometry(geometry: Geometry | undefined): DrawnGeometry | null {
  if (geometry instanceof Point) return { type: 'point', at: geometry.getCoordinates().slice(0, 2) as Vertex }
  if (geometry instanceof LineString) {
    return { type: 'line', vertices: geometry.getCoordinates().map((at) => at.slice(0, 2) as Vertex) }
  }
  if (geometry instanceof Polygon) {
    const ring = geometry.getCoordinates()[0] ?? []
    return { type: 'polygon', vertices: ring.slice(0, -1).map((at) => at.slice(0, 2) as Vertex) }
  }
  return null
}

function sameGeometry(a: DrawnGeometry | null, b: DrawnGeometry): boolean {
  if (!a || a.type !== b.type) return false
  const [one, other] = [verticesOf(a), verticesOf(b)]
  return one.length === other.length && one.every(([x, y], i) => x === other[i]?.[0] && y === other[i]?.[1])
}

/**
 * The drawing itself, on OpenLayers, in the plain plane of the project's coordinates. It shows what it is given and
 * reports what a hand does; the rows stay with the page, which hands them back changed or unchanged.
 */
export function createSiteMap(target: HTMLElement, events: SiteMapEvents): SiteMap {
  const projection = new Projection({ code: 'site', units: 'm' })
  const source = new VectorSource()
  const measured = new VectorSource()
  const view = new View({ projection, center: [0, 0], resolution: 1, enableRotation: false })
  const width = document.createElement('canvas').getContext('2d')
  let tool: SiteTool = { name: 'select' }
  let drawing: Draw | null = null
  let dragging = false
  let hovered: string | null = null
  let waitingFit: Extent | null = null
  let labels: (PlacedLabels & { resolution: number }) | null = null
  let imageLayer: ReturnType<typeof planImageLayer> | null = null
  let imageKey = ''

  const look: Look = {
    palette: readPalette(target),
    selectedId: null,
    hoveredId: null,
    handles: false,
    fontSize: 13,
    symbolScale: 1,
    side: (id) => labels?.sides.get(id) ?? null,
    along: (id) => labels?.lines.get(id) ?? null,
  }

  function labelsAt(resolution: number): PlacedLabels {
    if (width) width.font = `700 ${look.fontSize}px "Source Sans 3", system-ui, sans-serif`
    const wide = (label: string) => width?.measureText(label).width ?? label.length * 7
    const drawn = source.getFeatures().map(drawnOf)
    const symbols = drawn.flatMap(({ id, label, geometry }) =>
      geometry.type === 'point'
        ? [{ id, x: geometry.at[0] / resolution, y: -geometry.at[1] / resolution, width: wide(label) }]
        : [],
    )
    const lines = drawn.flatMap(({ id, label, geometry }): LabelledLine[] => {
      if (geometry.type !== 'line') return []
      const vertices = geometry.vertices.map(([x, y]): Vertex => [x / resolution, -y / resolution])
      return [{ id, vertices, width: wide(label) }]
    })
    look.symbolScale = symbolScale(symbols, 30)
    return placeLabels(symbols, lines, symbolReach * look.symbolScale, look.fontSize)
  }

  const layer = new VectorLayer({
    source,
    declutter: true,
    style: (feature, resolution) => {
      if (labels?.resolution !== resolution) labels = { resolution, ...labelsAt(resolution) }
      return stylesFor(feature as Feature, resolution, look)
    },
  })
  const measuredLayer = new VectorLayer({
    source: measured,
    zIndex: 5,
    style: () => measuredStyle(look.palette),
  })

  const map = new OlMap({
    target,
    controls: [],
    interactions: [
      // A finger scrolls the page until the drawing has the focus; a mouse or pen may pan at once.
      new DragPan({
        kinetic: new Kinetic(-0.005, 0.05, 100),
        condition: (event) =>
          primaryAction(event) &&
          ((event.originalEvent as PointerEvent).pointerType !== 'touch' || focus(event)),
      }),
      new PinchZoom(),
      new KeyboardPan(),
      new KeyboardZoom(),
      // The wheel scrolls the page until the drawing has the focus, or with Ctrl.
      new MouseWheelZoom({ condition: (event) => focus(event) || platformModifierKeyOnly(event) }),
    ],
    layers: [layer, measuredLayer],
    view,
  })

  function pick(pixel: number[]): Feature | null {
    const found: Feature[] = []
    map.forEachFeatureAtPixel(
      pixel,
      (feature) => {
        if (feature instanceof Feature && !drawnOf(feature).muted && !found.includes(feature))
          found.push(feature)
      },
      { layerFilter: (candidate) => candidate === layer, hitTolerance: 6 },
    )
    // A point before a line, a line before an area, a small area before a large one.
    const order = (feature: Feature) => {
      const geometry = feature.getGeometry()
      if (geometry instanceof Polygon) return 2 + geometry.getArea()
      return geometry instanceof Point ? 0 : 1
    }
    return found.sort((a, b) => order(a) - order(b))[0] ?? null
  }

  function byId(id: string | null): Feature | null {
    return id === null ? null : (source.getFeatureById(id) as Feature | null)
  }

  function knownVertices(except?: Feature): Vertex[] {
    return source
      .getFeatures()
      .filter((feature) => feature !== except)
      .flatMap((feature) => verticesOf(drawnOf(feature).geometry))
  }

  function decimals(): number {
    return decimalsAt(view.getResolution() ?? 1)
  }

  function restore(feature: Feature) {
    feature.setGeometry(geometryFrom(drawnOf(feature).geometry))
  }

  /** Reports a changed row, or puts it back where it was when the new geometry cannot stand. */
  function report(feature: Feature, vertices: Vertex[]) {
    const { id, geometry } = drawnOf(feature)
    const changed: DrawnGeometry =
      geometry.type === 'point'
        ? { type: 'point', at: vertices[0] as Vertex }
        : { type: geometry.type, vertices }
    const problem = geometryProblem(changed)
    if (problem) events.onTrouble(problem)
    if (problem || sameGeometry(geometry, changed)) restore(feature)
    else events.onChange(id, changed)
  }

  map.on('click', (event) => {
    if (tool.name === 'draw' || tool.name === 'measure' || altKeyOnly(event)) return
    const picked = pick(event.pixel)
    events.onSelect(picked ? drawnOf(picked).id : null)
  })
  map.on('pointermove', (event) => {
    events.onPointer(event.coordinate.slice(0, 2) as Vertex, decimals())
    if (event.dragging || dragging) return
    const still = tool.name === 'draw' || tool.name === 'measure'
    const picked = still ? null : pick(event.pixel)
    hover(picked ? drawnOf(picked).id : null)
    target.style.cursor = still ? 'crosshair' : picked ? (tool.name === 'move' ? 'move' : 'pointer') : ''
  })
  function leave() {
    events.onPointer(null, 0)
    hover(null)
  }
  target.addEventListener('pointerleave', leave)

  function hover(id: string | null) {
    if (id === hovered) return
    hovered = id
    events.onHover(id)
  }

  view.on('change:resolution', () => events.onScale(view.getResolution() ?? 1))
  map.on('change:size', () => {
    const [across = 0] = map.getSize() ?? []
    look.fontSize = across < 480 ? 14 : 13
    labels = null
    if (waitingFit && across > 0) show(waitingFit)
  })

  const reshaping = new Collection<Feature>()
  const moving = new Collection<Feature>()
  let toolInteractions: Interaction[] = []

  function reshape(): Interaction[] {
    const modify = new Modify({
      features: reshaping,
      pixelTolerance: 10,
      deleteCondition: (event) => altKeyOnly(event) && singleClick(event),
      style: () => new Style({ image: handle(look.palette) }),
    })
    modify.on('modifystart', () => {
      dragging = true
    })
    modify.on('modifyend', (event) => {
      dragging = false
      for (const feature of event.features.getArray()) {
        const geometry = drawnGeometry(feature.getGeometry())
        if (!geometry) continue
        const known = [...knownVertices(feature), ...verticesOf(drawnOf(feature).geometry)]
        report(feature, roundedVertices(verticesOf(geometry), decimals(), known))
      }
    })
    return [modify, new Snap({ source, pixelTolerance: 9 })]
  }

  function move(): Interaction[] {
    const translate = new Translate({
      features: moving,
      hitTolerance: 6,
      condition: (event: MapBrowserEvent) => {
        const picked = primaryAction(event) ? pick(event.pixel) : null
        moving.clear()
        if (picked) moving.push(picked)
        return picked !== null
      },
    })
    translate.on('translatestart', () => {
      dragging = true
      const [feature] = moving.getArray()
      if (feature) events.onSelect(drawnOf(feature).id)
    })
    translate.on('translateend', () => {
      dragging = false
      const [feature] = moving.getArray()
      const geometry = feature && drawnGeometry(feature.getGeometry())
      if (!geometry) return
      report(feature, movedVertices(verticesOf(drawnOf(feature).geometry), verticesOf(geometry), decimals()))
    })
    return [translate]
  }

  function draw(kind: DrawnKind): Interaction[] {
    const shape = shapeOf(kind)
    const interaction = new Draw({
      ...(kind === 'extent'
        ? { type: 'Circle', geometryFunction: createBox() }
        : { type: shape === 'point' ? 'Point' : shape === 'line' ? 'LineString' : 'Polygon' }),
      style: () => sketchStyles(look.palette),
      stopClick: true,
      freehandCondition: () => false,
    })
    interaction.on('drawend', (event) => {
      const geometry = drawnGeometry(event.feature.getGeometry())
      if (!geometry) return
      const vertices = roundedVertices(verticesOf(geometry), decimals(), knownVertices())
      const drawn: DrawnGeometry =
        geometry.type === 'point'
          ? { type: 'point', at: vertices[0] as Vertex }
          : { type: geometry.type, vertices }
      const problem = geometryProblem(drawn)
      if (problem) events.onTrouble(problem)
      else events.onDraw(kind, drawn)
    })
    drawing = interaction
    return [interaction, new Snap({ source, pixelTolerance: 9 })]
  }

  function measure(): Interaction[] {
    const interaction = new Draw({
      type: 'LineString',
      source: measured,
      style: () => measuredStyle(look.palette).concat(sketchStyles(look.palette).slice(2)),
      stopClick: true,
      freehandCondition: () => false,
    })
    interaction.on('drawstart', (event) => {
      measured.clear()
      event.feature.getGeometry()?.on('change', (changed) => {
        const vertices = (changed.target as LineString).getCoordinates() as Vertex[]
        events.onMeasure(lineLength(vertices), lineLength(vertices.slice(-2)))
      })
    })
    drawing = interaction
    return [interaction, new Snap({ source, pixelTolerance: 9 })]
  }

  function setTool(next: SiteTool) {
    for (const interaction of toolInteractions) map.removeInteraction(interaction)
    drawing = null
    dragging = false
    measured.clear()
    tool = next
    toolInteractions =
      next.name === 'reshape'
        ? reshape()
        : next.name === 'move'
          ? move()
          : next.name === 'draw'
            ? draw(next.kind)
            : next.name === 'measure'
              ? measure()
              : []
    for (const interaction of toolInteractions) map.addInteraction(interaction)
    look.handles = next.name === 'reshape'
    target.style.cursor = ''
    hover(null)
    handOver()
    layer.changed()
  }

  /** The selected row is the one whose vertices can be taken hold of. */
  function handOver() {
    const selected = tool.name === 'reshape' ? byId(look.selectedId) : null
    const wanted = selected && !drawnOf(selected).muted ? selected : null
    if (reshaping.item(0) === wanted && reshaping.getLength() <= 1) return
    reshaping.clear()
    if (wanted) reshaping.push(wanted)
  }

  function setFeatures(features: readonly DrawnFeature[]) {
    const wanted = new Set(features.map((feature) => feature.id))
    let changed = false
    for (const feature of source.getFeatures()) {
      if (wanted.has(drawnOf(feature).id)) continue
      source.removeFeature(feature)
      changed = true
    }
    for (const drawn of features) {
      const known = byId(drawn.id)
      if (known) {
        // A page may build its list anew at every move of the pointer: equal rows cost no drawing.
        if (JSON.stringify(drawnOf(known)) !== JSON.stringify(drawn)) {
          known.set('drawn', drawn)
          changed = true
        }
        if (!dragging && !sameGeometry(drawnGeometry(known.getGeometry()), drawn.geometry)) restore(known)
      } else {
        const feature = new Feature({ geometry: geometryFrom(drawn.geometry), drawn })
        feature.setId(drawn.id)
        source.addFeature(feature)
        changed = true
      }
    }
    handOver()
    if (!changed) return
    labels = null
    layer.changed()
  }

  function show(extent: Extent) {
    const size = map.getSize()
    if (!size?.[0] || !size[1]) {
      waitingFit = extent
      return
    }
    waitingFit = null
    const [xMin, yMin, xMax, yMax] = extent
    // A single point has no size of its own: show some ground about it.
    const spare = Math.max(xMax - xMin, yMax - yMin) > 0 ? 0 : 50
    view.fit([xMin - spare, yMin - spare, xMax + spare, yMax + spare], {
      size,
      padding: size[0] < 480 ? [14, 14, 34, 14] : [24, 24, 40, 24],
    })
    events.onScale(view.getResolution() ?? 1)
  }

  function setPlanImage(image: ShownPlanImage | null) {
    const key = image ? JSON.stringify([image.url, image.width, image.height, image.control]) : ''
    if (image && key === imageKey) {
      imageLayer?.setOpacity(image.opacity)
      return
    }
    imageKey = key
    if (imageLayer) map.removeLayer(imageLayer)
    imageLayer = image ? planImageLayer(image, projection, () => look.palette) : null
    if (imageLayer) map.addLayer(imageLayer)
  }

  const stopWatching = watchTheme(() => {
    look.palette = readPalette(target)
    imageLayer?.getSource()?.changed()
    layer.changed()
    measuredLayer.changed()
    // Print takes its picture at once.
    map.renderSync()
  })
  // Labels measured before the page's face has loaded would be cut.
  void document.fonts.ready.then(() => {
    labels = null
    layer.changed()
  })

  return {
    setFeatures,
    setTool,
    setPlanImage,
    show,
    setChoice(selectedId, hoveredId) {
      if (look.selectedId === selectedId && look.hoveredId === hoveredId) return
      look.selectedId = selectedId
      look.hoveredId = hoveredId
      hovered = hoveredId
      handOver()
      layer.changed()
    },
    zoom(steps) {
      view.adjustZoom(steps)
    },
    abandon() {
      const inHand = drawing?.getOverlay().getSource()?.getFeatures().length ?? 0
      const lines = measured.getFeatures().length
      drawing?.abortDrawing()
      measured.clear()
      events.onMeasure(null, 0)
      return lines > 0 || inHand > 1
    },
    stepBack() {
      drawing?.removeLastPoint()
    },
    destroy() {
      stopWatching()
      target.removeEventListener('pointerleave', leave)
      map.setTarget(undefined)
      map.dispose()
    },
  }
}
