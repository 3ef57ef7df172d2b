import { createHash } from 'node:crypto'
import { createWriteStream } from 'node:fs'
import { Transform, type Readable } from 'node:stream'
import { pipeline } from 'node:stream/promises'
import { InputError } from '../errors.ts'

/** Bytes that one request may still send; shared by the parts of a form. */
export interface ByteBudget {
  readonly limitBytes: number
  usedBytes: number
}

export interface StoredStream {
  readonly bytes: number
  readonly sha256: string
}

/**
 * Writes a stream to a new file, chunk by chunk, as fast as the disk takes it, and hashes it on the way: while bytes are
 * still coming the processor has time, and nobody needs to read the file again for its checksum.
 *
 * The source is left alive when the budget is spent: whoever owns the connection must still answer on it.
 *
 * @returns bytes written, and their SHA-256 in hex.
 * @throws InputError LOG_TOO_LARGE once the budget is spent; the file then holds what came before and is the caller's to remove.
 *   The error of the source when it breaks off.
 */
export async function storeStream(source: Readable, path: string, budget: ByteBudget): Promise<StoredStream> {
  let bytes = 0
  const hash = createHash('sha256')
  const counted = new Transform({
    transform(chunk: Buffer, _encoding, done) {
      budget.usedBytes += chunk.length
      if (budget.usedBytes <= budget.limitBytes) {
        bytes += chunk.length
        hash.update(chunk)
        done(null, chunk)
      } else {
        done(tooLarge(budget.limitBytes))
      }
    },
  })
  const onError = (error: Error) => counted.destroy(error)
  const onClose = () => {
    if (!source.readableEnded) counted.destroy(new Error('the sender broke off'))
  }
  source.on('error', onError)
  source.on('close', onClose)
  if (source.destroyed && !source.readableEnded) onClose()
  else source.pipe(counted)
  try {
    await pipeline(counted, createWriteStream(path, { flags: 'wx', mode: 0o600 }))
    return { bytes, sha256: hash.digest('hex') }
  } finally {
    source.unpipe(counted)
    source.off('close', onClose)
  }
}

export function tooLarge(limitBytes: number): InputError {
  const megabytes = limitBytes / 1_000_000
  return new InputError('LOG_TOO_LARGE', `body: expected at most ${megabytes} MB as sent, got more`, {
    detail: { limitBytes },
  })
}
