import { InputError } from '../errors.ts'

const [LF, CR] = [10, 13]

/** How far the consumer of the lines has come; it counts, because it looks at every byte anyway. */
export interface LinePosition {
  lines: number
}

/**
 * Cuts chunks into slabs of whole lines, each ended by LF: CRLF and lone CR become LF. Memory holds a chunk and a line.
 *
 * @param position  lines of the slabs given so far, kept up by the consumer.
 * @throws InputError LOG_LINE_TOO_LONG as soon as an unfinished line exceeds `maxLineBytes`, before it is read to its end
 */
export async function* textLines(
  name: string,
  chunks: AsyncIterable<Buffer>,
  maxLineBytes: number,
  position: LinePosition,
): AsyncGenerator<Buffer> {
  let rest: Buffer = Buffer.alloc(0)
  let pendingCr = false
  for await (const raw of chunks) {
    const chunk = toLineFeeds(raw, pendingCr)
    pendingCr = raw[raw.length - 1] === CR
    const last = chunk.lastIndexOf(LF)
    if (last < 0) {
      rest = Buffer.concat([rest, chunk])
    } else {
      const whole = chunk.subarray(0, last + 1)
      const slab = rest.length > 0 ? Buffer.concat([rest, whole]) : whole
      // Copied: the chunk is given back to the stream while the rest waits.
      rest = Buffer.from(chunk.subarray(last + 1))
      yield slab
    }
    if (!(rest.length <= maxLineBytes)) throw lineTooLong(name, position.lines + 1, maxLineBytes)
  }
  if (rest.length > 0) yield Buffer.concat([rest, Buffer.from('\n')])
}

export function lineTooLong(name: string, line: number, maxLineBytes: number): InputError {
  return new InputError(
    'LOG_LINE_TOO_LONG',
    `${name} line ${line}: expected at most ${maxLineBytes} bytes in a line, got more; is it a text file with line ends?`,
    { detail: { line } },
  )
}

/** A chunk with LF line ends; `pendingCr`: the chunk before ended in CR, which has become a line end already. */
function toLineFeeds(raw: Buffer, pendingCr: boolean): Buffer {
  const skip = pendingCr && raw[0] === LF ? 1 : 0
  const firstCr = raw.indexOf(CR)
  if (firstCr < 0) return skip ? raw.subarray(1) : raw
  const out = Buffer.allocUnsafe(raw.length)
  let n = 0
  for (let i = skip; i < raw.length; i++) {
    const byte = raw[i]!
    if (byte === CR) {
      out[n++] = LF
      if (raw[i + 1] === LF) i++
    } else out[n++] = byte
  }
  return out.subarray(0, n)
}
