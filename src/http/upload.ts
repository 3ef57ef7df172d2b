import { randomUUID } from 'node:crypto'
import { createReadStream } from 'node:fs'
import { mkdir, rm } from 'node:fs/promises'
import { basename, join } from 'node:path'
import { Readable } from 'node:stream'
import { pipeline } from 'node:stream/promises'
import { createGunzip } from 'node:zlib'
import type { MultipartFile, MultipartValue } from '@fastify/multipart'
import type { FastifyRequest } from 'fastify'
import { InputError } from '../errors.ts'
import type { LogFile } from '../replay/contract.ts'
import { parseSite } from '../setup/index.ts'
import type { SiteFile } from '../sheet/index.ts'
import { DOCUMENT_LIMIT_BYTES as SITE_LIMIT_BYTES } from './json-body.ts'
import { bareMediaType, FORM_MEDIA_TYPE, LOG_MEDIA_TYPES } from './media-types.ts'
import { storeStream, tooLarge, type ByteBudget } from './store-stream.ts'

export interface UploadLimits {
  /** An existing folder; every upload gets one of its own below. */
  readonly folder: string
  readonly bodyLimitBytes: number
  /** Silence after which the connection is given up, ms. */
  readonly idleMs: number
}

export interface Upload {
  readonly logs: LogFile[]
  readonly site: SiteFile
  /** Removes what was stored. */
  remove(): Promise<void>
}

export interface UploadOptions {
  /** Whether a form may hold a site file beside the logs. */
  readonly takesSite: boolean
  /** Name of a log that is the whole body; default: what Content-Disposition says. */
  readonly name: string | undefined
}

/**
 * Stores the logs of a request on disk while they come in; nothing is held in memory but a site file.
 *
 * @throws InputError LOG_EMPTY, LOG_TOO_LARGE, LOG_CORRUPT, BAD_SITE, BAD_REQUEST, UNSUPPORTED_MEDIA_TYPE; then, as after
 *   a broken connection, nothing stays on disk.
 */
export async function receiveUpload(
  request: FastifyRequest,
  limits: UploadLimits,
  options: UploadOptions,
): Promise<Upload> {
  checkMediaType(request)
  const declaredBytes = Number(request.headers['content-length'] ?? 0)
  if (declaredBytes > limits.bodyLimitBytes) throw tooLarge(limits.bodyLimitBytes)
  const encoding = contentEncoding(request)
  const folder = join(limits.folder, `upload-${randomUUID()}`)
  const remove = () => rm(folder, { recursive: true, force: true })
  const socket = request.raw.socket
  const giveUp = () => {
    request.log.info('upload given up: the sender went silent')
    socket.destroy()
  }
  try {
    await mkdir(folder, { mode: 0o700 })
    socket.setTimeout(limits.idleMs, giveUp)
    const budget: ByteBudget = { limitBytes: limits.bodyLimitBytes, usedBytes: 0 }
    const received = request.isMultipart()
      ? await receiveForm(request, folder, budget, options.takesSite)
      : { logs: [await receiveBody(request, folder, budget, { encoding, name: options.name })], site: {} }
    return { ...received, remove }
  } catch (error) {
    await remove()
    throw error
  } finally {
    socket.setTimeout(0)
    socket.off('timeout', giveUp)
  }
}

function checkMediaType(request: FastifyRequest): void {
  const type = bareMediaType(request.headers['content-type'])
  if (request.isMultipart() || type === '' || (LOG_MEDIA_TYPES as readonly string[]).includes(type)) return
  throw new InputError(
    'UNSUPPORTED_MEDIA_TYPE',
    `Content-Type: expected ${[...LOG_MEDIA_TYPES, FORM_MEDIA_TYPE].join(' | ')}, got "${type.slice(0, 100)}"`,
  )
}

function contentEncoding(request: FastifyRequest): 'gzip' | 'identity' {
  const named = (request.headers['content-encoding'] ?? 'identity').trim().toLowerCase()
  const encoding = named === 'x-gzip' ? 'gzip' : named
  if (encoding === 'identity' || (encoding === 'gzip' && !request.isMultipart())) return encoding
  throw new InputError(
    'UNSUPPORTED_MEDIA_TYPE',
    request.isMultipart()
      ? `Content-Encoding: expected none around a form (a log in it may be gzip), got "${named}"`
      : `Content-Encoding: expected gzip or none, got "${named}"`,
  )
}

async function receiveBody(
  request: FastifyRequest,
  folder: string,
  budget: ByteBudget,
  { encoding, name: givenName }: { encoding: 'gzip' | 'identity'; name: string | undefined },
): Promise<LogFile> {
  const path = join(folder, 'log-1')
  const name = fileName(
    givenName ?? /filename="?([^";]+)"?/i.exec(request.headers['content-disposition'] ?? '')?.[1],
    'log',
  )
  const stored = request.body instanceof Readable ? await storeStream(request.body, path, budget) : null
  if (stored === null || stored.bytes === 0)
    throw new InputError('LOG_EMPTY', 'body: expected a log, got no bytes')
  const { sha256 } = stored
  if (encoding !== 'gzip') return { name, path, sha256 }
  const peeled = await peelEncoding(path, budget.limitBytes)
  return peeled === path ? { name, path, sha256 } : { name, path: peeled }
}

/**
 * The log reader takes gzip by its first bytes, so an encoded body is kept as it came. Only a `.gz` file that was encoded
 * once more for the way is unpacked by one layer.
 */
async function peelEncoding(path: string, limitBytes: number): Promise<string> {
  if (!(await startsAsGzip(createReadStream(path)))) {
    throw new InputError('LOG_CORRUPT', 'body: expected gzip as Content-Encoding says, got other bytes')
  }
  const inner = createReadStream(path).pipe(createGunzip())
  if (!(await startsAsGzip(inner))) return path
  const peeled = `${path}-peeled`
  const unpacked = createGunzip()
  const broken = pipeline(createReadStream(path), unpacked).catch(() => undefined)
  try {
    await storeStream(unpacked, peeled, { limitBytes, usedBytes: 0 })
  } catch (cause) {
    if (cause instanceof InputError) throw cause
    throw new InputError('LOG_CORRUPT', 'body: expected whole gzip data, got a damaged or truncated one', {
      cause,
    })
  } finally {
    unpacked.destroy()
    await broken
  }
  await rm(path)
  return peeled
}

/** Whether the stream starts with the two bytes of gzip. A stream that breaks does not; the log reader will say why. */
async function startsAsGzip(stream: Readable): Promise<boolean> {
  try {
    let head = Buffer.alloc(0)
    for await (const chunk of stream as AsyncIterable<Buffer>) {
      head = Buffer.concat([head, chunk])
      if (head.length >= 2) break
    }
    return head[0] === 0x1f && head[1] === 0x8b
  } catch {
    return false
  } finally {
    stream.destroy()
  }
}

async function receiveForm(
  request: FastifyRequest,
  folder: string,
  budget: ByteBudget,
  takesSite: boolean,
): Promise<{ logs: LogFile[]; site: SiteFile }> {
  const logs: LogFile[] = []
  let site: SiteFile | undefined
  for await (const part of wellFormedParts(request)) {
    if (part.fieldname === 'log' && part.type === 'file') {
      const name = fileName(part.filename, `log ${logs.length + 1}`)
      const path = join(folder, `log-${logs.length + 1}`)
      const { bytes, sha256 } = await storeStream(part.file, path, budget).catch((cause: unknown) => {
        throw asFormMistake(cause)
      })
      if (bytes === 0) throw new InputError('LOG_EMPTY', `${name}: expected a log, got no bytes`)
      logs.push({ name, path, sha256 })
    } else if (part.fieldname === 'site' && takesSite) {
      if (site !== undefined) throw new InputError('BAD_REQUEST', 'form: expected one part "site", got two')
      site = parseSite(await partText(part), 'site')
    } else {
      throw new InputError(
        'BAD_REQUEST',
        `form: expected parts ${takesSite ? '"site" and "log"' : '"log" alone'}, got "${part.fieldname.slice(0, 80)}"`,
      )
    }
  }
  if (logs.length === 0) throw new InputError('LOG_EMPTY', 'form: expected at least one part "log", got none')
  return { logs, site: site ?? {} }
}

/** The parts of a form; what the form parser throws is a plain Error, and the sender's mistake. */
async function* wellFormedParts(request: FastifyRequest): AsyncGenerator<MultipartFile | MultipartValue> {
  try {
    yield* request.parts()
  } catch (cause) {
    throw asFormMistake(cause)
  }
}

function asFormMistake(cause: unknown): unknown {
  if (!(cause instanceof Error) || cause.constructor !== Error || 'code' in cause) return cause
  return new InputError('BAD_REQUEST', `form: expected whole multipart data, got "${cause.message}"`, {
    cause,
  })
}

async function partText(part: MultipartFile | MultipartValue): Promise<string> {
  const oversize = new InputError(
    'BAD_SITE',
    `site: expected at most ${SITE_LIMIT_BYTES / 1_000_000} MB, got more`,
  )
  if (part.type === 'field') {
    if (part.valueTruncated) throw oversize
    return typeof part.value === 'string' ? part.value : JSON.stringify(part.value)
  }
  const chunks: Buffer[] = []
  let bytes = 0
  for await (const chunk of part.file as AsyncIterable<Buffer>) {
    bytes += chunk.length
    if (bytes > SITE_LIMIT_BYTES) throw oversize
    chunks.push(chunk)
  }
  return Buffer.concat(chunks).toString('utf8')
}

/** Limits of the form parser. Logs are counted by the byte budget, which spans all parts. */
export const FORM_LIMITS = {
  fieldSize: SITE_LIMIT_BYTES,
  fieldNameSize: 100,
  fields: 10,
  files: 1000,
  parts: 1010,
  fileSize: Number.MAX_SAFE_INTEGER,
  headerPairs: 100,
} as const

/** The last part of a name from outside, without control characters: it is printed in receipts, and never opened. */
function fileName(raw: string | undefined, fallback: string): string {
  // eslint-disable-next-line no-control-regex -- control characters are what is taken out
  const name = basename((raw ?? '').replaceAll('\\', '/').replaceAll(/[\u0000-\u001f\u007f]/g, '')).slice(
    0,
    200,
  )
  return name.trim() === '' ? fallback : name
}
