/** What the mail page shows of a message. */
export interface ReadMessage {
  from: string
  subject: string
  /** The first plain-text part; empty when there is none. */
  text: string
}

interface Part {
  headers: Map<string, string>
  body: string
}

/**
 * Reads a mail in Internet Message Format: enough for what Lavant sends (headers with encoded words, RFC 2047;
 * one text part or nested multiparts, RFC 2046; quoted-printable and base64, RFC 2045). Only UTF-8 and its
 * subsets are understood; other bytes come out as replacement characters.
 */
export function readMessage(raw: Buffer): ReadMessage {
  const part = split(raw.toString('latin1'))
  return {
    from: decodeWords(part.headers.get('from') ?? ''),
    subject: decodeWords(part.headers.get('subject') ?? ''),
    text: plainText(part)?.replaceAll('\r\n', '\n').trimEnd() ?? '',
  }
}

/** Headers (names in lower case, unfolded) and body of a message or a part, one character a byte. */
function split(raw: string): Part {
  const end = raw.search(/\r?\n\r?\n/)
  const head = end < 0 ? raw : raw.slice(0, end)
  const body = end < 0 ? '' : raw.slice(end).replace(/^\r?\n\r?\n/, '')
  const headers = new Map<string, string>()
  for (const line of head.replaceAll(/\r?\n[ \t]+/g, ' ').split(/\r?\n/)) {
    const colon = line.indexOf(':')
    if (colon > 0) headers.set(line.slice(0, colon).toLowerCase(), line.slice(colon + 1).trim())
  }
  return { headers, body }
}

function plainText({ headers, body }: Part): string | undefined {
  const type = headers.get('content-type') ?? 'text/plain'
  const boundary = /^multipart\//i.test(type) ? /boundary="?([^";]+)"?/i.exec(type)?.[1] : undefined
  if (boundary !== undefined) {
    // What stands before the first boundary is not a part; the last piece is the closing dashes.
    const pieces = `\r\n${body}`.split(`\r\n--${boundary}`).slice(1, -1)
    for (const piece of pieces) {
      const text = plainText(split(piece.replace(/^[ \t]*\r?\n/, '')))
      if (text !== undefined) return text
    }
    return undefined
  }
  if (!/^text\/plain/i.test(type)) return undefined
  const encoding = (headers.get('content-transfer-encoding') ?? '7bit').toLowerCase()
  if (encoding === 'base64') return Buffer.from(body, 'base64').toString('utf8')
  if (encoding === 'quoted-printable') return unquote(body.replaceAll(/=[ \t]*\r?\n/g, ''))
  return Buffer.from(body, 'latin1').toString('utf8')
}

function unquote(text: string): string {
  const bytes = text.replaceAll(/=([0-9a-f]{2})/gi, (_, hex: string) =>
    String.fromCharCode(Number.parseInt(hex, 16)),
  )
  return Buffer.from(bytes, 'latin1').toString('utf8')
}

/** Decodes encoded words; white space between two of them is not part of the text. */
function decodeWords(header: string): string {
  const text = Buffer.from(header, 'latin1')
    .toString('utf8')
    .replaceAll(/\?=\s+=\?/g, '?==?')
  return text.replaceAll(/=\?[^?]+\?([bq])\?([^?]*)\?=/gi, (_, kind: string, word: string) =>
    kind.toLowerCase() === 'b'
      ? Buffer.from(word, 'base64').toString('utf8')
      : unquote(word.replaceAll('_', ' ')),
  )
}
