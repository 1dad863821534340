import { readFileSync } from 'node:fs'
import { expect, it } from 'vitest'
import { readPictureHeader } from './picture-header'

const sitePlan = readFileSync(new URL('../../database/seeds/site-plan.png', import.meta.url))

/** A JPEG up to its frame header: start, the segments given, then SOF2 of this size. */
function jpeg(width: number, height: number, segments: number[][] = []): Uint8Array {
  const frame = [0xff, 0xc2, 0, 17, 8, height >> 8, height & 255, width >> 8, width & 255, 3]
  return Uint8Array.from([0xff, 0xd8, ...segments.flat(), ...frame, 1, 0x22, 0, 2, 0x11, 1, 3, 0x11, 1])
}

function exif(orientation: number): number[] {
  const tiff = [
    0x4d,
    0x4d,
    0,
    42,
    0,
    0,
    0,
    8,
    0,
    1,
    1,
    0x12,
    0,
    3,
    0,
    0,
    0,
    1,
    0,
    orientation,
    0,
    0,
    0,
    0,
    0,
    0,
  ]
  const body = [0x45, 0x78, 0x69, 0x66, 0, 0, ...tiff]
  return [0xff, 0xe1, 0, body.length + 2, ...body]
}

it('reads the size of a PNG from its header', () => {
  expect(readPictureHeader(sitePlan)).toEqual({
    ok: true,
    contentType: 'image/png',
    width: 1600,
    height: 1100,
  })
})

it('reads the size of a JPEG behind other segments and tables', () => {
  const huffman = [0xff, 0xc4, 0, 5, 0, 0, 0]
  const comment = [0xff, 0xff, 0xfe, 0, 4, 0x68, 0x69]
  expect(readPictureHeader(jpeg(1234, 567, [exif(1), huffman, comment]))).toEqual({
    ok: true,
    contentType: 'image/jpeg',
    width: 1234,
    height: 567,
  })
})

it('refuses what is no PNG or JPEG, whatever it is called', () => {
  for (const text of ['<svg xmlns="http://www.w3.org/2000/svg"/>', 'GIF89a', '%PDF-1.7', '']) {
    expect(readPictureHeader(new TextEncoder().encode(text))).toMatchObject({ ok: false, reason: 'kind' })
  }
})

it('refuses a photograph with a rotation mark', () => {
  expect(readPictureHeader(jpeg(10, 10, [exif(6)]))).toMatchObject({ ok: false, reason: 'turned' })
})

it('refuses a header that is cut off or gives no size', () => {
  expect(readPictureHeader(sitePlan.subarray(0, 20))).toMatchObject({ ok: false, reason: 'damaged' })
  expect(readPictureHeader(jpeg(10, 10).subarray(0, 8))).toMatchObject({ ok: false, reason: 'damaged' })
  expect(readPictureHeader(jpeg(0, 10))).toMatchObject({ ok: false, reason: 'damaged' })
  expect(readPictureHeader(Uint8Array.from([0xff, 0xd8, 0xff, 0xe0, 0, 0]))).toMatchObject({ ok: false })
})
