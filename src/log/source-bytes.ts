import { createHash } from 'node:crypto'
import { createReadStream } from 'node:fs'
import { open } from 'node:fs/promises'
import { createGunzip } from 'node:zlib'
import { InputError } from '../errors.ts'
import type { LogLimits, LogSource } from './contract.ts'

const CHUNK_BYTES = 1024 ** 2

/** Bytes of a log as they come: read once, hashed as sent, decompressed. */
export interface SourceBytes {
  readonly chunks: AsyncIterable<Buffer>
  /** SHA-256 (hex) of the bytes as sent; valid after the chunks were read to their end. */
  sha256(): string
}

/**
 * @throws (from the chunks) InputError LOG_CORRUPT for a damaged or truncated gzip, LOG_TOO_LARGE beyond
 *   `maxDecompressedBytes`; LOG_NOT_FOUND when there is no such file.
 */
export async function sourceBytes(source: LogSource, limits: LogLimits): Promise<SourceBytes> {
  const gzip = await startsAsGzip(source)
  const hash = source.sha256 === undefined ? createHash('sha256') : null
  let digest = source.sha256 ?? ''
  return {
    sha256: () => (digest ||= hash!.digest('hex')),
    chunks: chunksOf(source, limits, gzip, hash),
  }
}

async function* chunksOf(
  source: LogSource,
  limits: LogLimits,
  gzip: boolean,
  hash: { update(bytes: Buffer): unknown } | null,
): AsyncGenerator<Buffer> {
  const file = createReadStream(source.path, { highWaterMark: CHUNK_BYTES })
  if (hash) file.on('data', (bytes) => hash.update(bytes as Buffer))
  const stream = gzip ? file.pipe(createGunzip({ chunkSize: CHUNK_BYTES })) : file
  // A read error of the file does not travel through the pipe by itself.
  if (stream !== file) file.on('error', (error) => stream.destroy(error))
  let bytes = 0
  try {
    for await (const chunk of stream) {
      bytes += (chunk as Buffer).length
      if (!(bytes <= limits.maxDecompressedBytes)) {
        throw new InputError(
          'LOG_TOO_LARGE',
          `${source.name}: expected at most ${limits.maxDecompressedBytes} bytes${gzip ? ' after decompression' : ''}, got more`,
        )
      }
      yield chunk as Buffer
    }
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code ?? ''
    if (gzip && (code.startsWith('Z_') || code === 'ERR_STREAM_PREMATURE_CLOSE')) {
      throw new InputError(
        'LOG_CORRUPT',
        `${source.name}: expected a whole gzip file, got one that breaks off or is damaged after ${bytes} decompressed bytes; send it again`,
        { cause: error },
      )
    }
    throw error
  } finally {
    file.destroy()
  }
}

export async function startsAsGzip(source: LogSource): Promise<boolean> {
  let file
  try {
    file = await open(source.path, 'r')
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code
    if (code !== 'ENOENT' && code !== 'EISDIR' && code !== 'EACCES') throw error
    throw new InputError('LOG_NOT_FOUND', `${source.name}: expected a readable file, got ${code}`, {
      cause: error,
    })
  }
  try {
    const { buffer, bytesRead } = await file.read(Buffer.alloc(2), 0, 2, 0)
    return bytesRead === 2 && buffer[0] === 0x1f && buffer[1] === 0x8b
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== 'EISDIR') throw error
    throw new InputError('LOG_NOT_FOUND', `${source.name}: expected a file, got a folder`, { cause: error })
  } finally {
    await file.close()
  }
}
