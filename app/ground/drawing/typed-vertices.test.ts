import { describe, expect, it } from 'vitest'
import { parseVertices, typedVertices } from './typed-vertices'

describe('typed coordinates', () => {
  it('come one vertex a line, with a comma, a space or a tab between x and y', () => {
    const parsed = parseVertices('482545.25, 105292\n482545.25 105370\r\n\n482655\t105370\n')
    expect(parsed).toEqual({
      ok: true,
      vertices: [
        [482545.25, 105292],
        [482545.25, 105370],
        [482655, 105370],
      ],
    })
  })

  it('may carry decimal commas where a tab or a semicolon parts them', () => {
    expect(parseVertices('12,5;−3,25')).toEqual({ ok: true, vertices: [[12.5, -3.25]] })
  })

  it('are refused by line when they are not two numbers', () => {
    expect(parseVertices('1 2\n3 4 5')).toEqual({
      ok: false,
      message: 'Line 2: write two numbers, x then y.',
    })
    expect(parseVertices('1,')).toMatchObject({ ok: false })
  })

  it('read back as they were written', () => {
    const vertices: [number, number][] = [
      [482600.125, 105000],
      [-0.5, 1e-7],
    ]
    expect(parseVertices(typedVertices(vertices))).toEqual({ ok: true, vertices })
  })
})
