import { isUtf8 } from 'node:buffer'

export type Encoding = 'utf-8' | 'utf-16le' | 'utf-16be'

/** Encoding of a text by byte-order mark, or by the zero bytes that UTF-16 leaves in digits and Latin letters. */
export function sniffEncoding(sample: Uint8Array): { encoding: Encoding; markBytes: number } {
  if (sample[0] === 0xef && sample[1] === 0xbb && sample[2] === 0xbf) {
    return { encoding: 'utf-8', markBytes: 3 }
  }
  if (sample[0] === 0xff && sample[1] === 0xfe) return { encoding: 'utf-16le', markBytes: 2 }
  if (sample[0] === 0xfe && sample[1] === 0xff) return { encoding: 'utf-16be', markBytes: 2 }
  const length = Math.min(sample.length, 4096) & ~1
  let even = 0
  let odd = 0
  for (let i = 0; i < length; i += 2) {
    if (sample[i] === 0) even++
    if (sample[i + 1] === 0) odd++
  }
  const most = 0.4 * length
  if (length >= 4 && odd > most && even === 0) return { encoding: 'utf-16le', markBytes: 0 }
  if (length >= 4 && even > most && odd === 0) return { encoding: 'utf-16be', markBytes: 0 }
  return { encoding: 'utf-8', markBytes: 0 }
}

/** Turns chunks of any encoding into UTF-8 chunks without byte-order mark. Bytes that claim to be UTF-8 pass unchecked. */
export async function* toUtf8(
  chunks: AsyncIterable<Buffer>,
  format: { encoding: Encoding; markBytes: number },
): AsyncGenerator<Buffer> {
  const decoder = format.encoding === 'utf-8' ? null : new TextDecoder(format.encoding, { ignoreBOM: false })
  let skip = decoder ? 0 : format.markBytes
  for await (const chunk of chunks) {
    if (decoder) {
      yield Buffer.from(decoder.decode(chunk, { stream: true }))
      continue
    }
    const skipped = Math.min(skip, chunk.length)
    skip -= skipped
    if (chunk.length > skipped) yield skipped > 0 ? chunk.subarray(skipped) : chunk
  }
  const rest = decoder?.decode()
  if (rest) yield Buffer.from(rest)
}

const windows1252 = new TextDecoder('windows-1252')

/**
 * Whole lines as valid UTF-8. A line that is none is taken as Windows-1252 (which contains Latin-1), so that one umlaut in row
 * 50,000 of a file that looked like ASCII neither stops the reading nor spoils its neighbours.
 * @returns the same bytes when they are valid.
 */
export function validUtf8(lines: Buffer): { bytes: Buffer; repairedLines: number } {
  if (isUtf8(lines)) return { bytes: lines, repairedLines: 0 }
  const parts: Buffer[] = []
  let repairedLines = 0
  for (let from = 0; from < lines.length;) {
    const end = lines.indexOf(10, from)
    const to = end < 0 ? lines.length : end + 1
    const line = lines.subarray(from, to)
    if (isUtf8(line)) parts.push(line)
    else {
      parts.push(Buffer.from(windows1252.decode(line)))
      repairedLines++
    }
    from = to
  }
  return { bytes: Buffer.concat(parts), repairedLines }
}
