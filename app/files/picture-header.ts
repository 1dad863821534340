/** What a PNG or JPEG says of itself in its first bytes. */
export type PictureHeader =
  | { ok: true; contentType: 'image/png' | 'image/jpeg'; width: number; height: number }
  | { ok: false; reason: 'kind' | 'damaged' | 'turned'; message: string }

const pngMark = [0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]

/**
 * Recognises a picture by its content, never by its name, and reads its size in pixels without decoding it.
 * PNG: signature and IHDR (ISO/IEC 15948, 5.2 and 11.2.2). JPEG: markers up to the frame header SOFn (ITU-T T.81,
 * B.1 and B.2.2). A photograph with a rotation mark (Exif orientation other than 1) is refused: a browser turns it and
 * a PDF doesn't, so its known points would lie in two places.
 */
export function readPictureHeader(bytes: Uint8Array): PictureHeader {
  if (pngMark.every((value, i) => bytes[i] === value)) return readPng(bytes)
  if (bytes[0] === 0xff && bytes[1] === 0xd8 && bytes[2] === 0xff) return readJpeg(bytes)
  return {
    ok: false,
    reason: 'kind',
    message: 'This file is neither a PNG nor a JPEG picture, whatever its name says.',
  }
}

const damaged = {
  ok: false,
  reason: 'damaged',
  message: 'This picture is damaged: its header gives no size.',
} as const

function sized(contentType: 'image/png' | 'image/jpeg', width: number, height: number): PictureHeader {
  return width > 0 && height > 0 ? { ok: true, contentType, width, height } : damaged
}

function readPng(bytes: Uint8Array): PictureHeader {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength)
  if (bytes.length < 33 || view.getUint32(12) !== 0x49484452) return damaged
  return sized('image/png', view.getUint32(16), view.getUint32(20))
}

function readJpeg(bytes: Uint8Array): PictureHeader {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength)
  let at = 2
  while (at + 4 <= bytes.length) {
    if (bytes[at] !== 0xff) return damaged
    const marker = bytes[at + 1] as number
    // Fill bytes, and markers without a length.
    if (marker === 0xff) {
      at += 1
      continue
    }
    if (marker === 0x01 || (marker >= 0xd0 && marker <= 0xd7)) {
      at += 2
      continue
    }
    const length = view.getUint16(at + 2)
    if (length < 2) return damaged
    if (marker === 0xe1 && orientationOf(bytes.subarray(at + 4, at + 2 + length)) !== 1) {
      return {
        ok: false,
        reason: 'turned',
        message:
          'This photograph carries a rotation mark. Save it upright in an image program, then upload it.',
      }
    }
    // SOF0 to SOF15, without the tables DHT (C4), JPG (C8) and DAC (CC).
    const frame = marker >= 0xc0 && marker <= 0xcf && marker !== 0xc4 && marker !== 0xc8 && marker !== 0xcc
    if (frame) {
      if (at + 9 > bytes.length) return damaged
      return sized('image/jpeg', view.getUint16(at + 7), view.getUint16(at + 5))
    }
    if (marker === 0xda || marker === 0xd9) return damaged
    at += 2 + length
  }
  return damaged
}

/** Orientation of an Exif segment (Exif 2.32, tag 0x0112); 1 (upright) where it says nothing. */
function orientationOf(segment: Uint8Array): number {
  const exif = [0x45, 0x78, 0x69, 0x66, 0, 0]
  if (segment.length < 14 || !exif.every((value, i) => segment[i] === value)) return 1
  const view = new DataView(segment.buffer, segment.byteOffset + 6, segment.byteLength - 6)
  const little = view.getUint16(0) === 0x4949
  const start = view.getUint32(4, little)
  if (start + 2 > view.byteLength) return 1
  const entries = view.getUint16(start, little)
  for (let i = 0; i < entries; i++) {
    const entry = start + 2 + i * 12
    if (entry + 12 > view.byteLength) return 1
    if (view.getUint16(entry, little) === 0x0112) return view.getUint16(entry + 8, little)
  }
  return 1
}
