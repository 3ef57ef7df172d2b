import { Readable } from 'node:stream'
import type { FastifyRequest } from 'fastify'
import { InputError } from '../errors.ts'
import { bareMediaType, JSON_MEDIA_TYPE } from './media-types.ts'

/** A site file of 5000 turbines with power curves is below 4 MB. */
export const DOCUMENT_LIMIT_BYTES = 8_000_000

/**
 * The JSON document of a request.
 *
 * @param idleMs  silence after which the connection is given up.
 * @throws InputError BAD_REQUEST, BODY_TOO_LARGE, UNSUPPORTED_MEDIA_TYPE
 */
export async function receiveJson(request: FastifyRequest, idleMs: number): Promise<unknown> {
  const type = bareMediaType(request.headers['content-type'])
  if (request.body !== undefined && request.body !== null && type !== JSON_MEDIA_TYPE) {
    throw new InputError(
      'UNSUPPORTED_MEDIA_TYPE',
      `Content-Type: expected ${JSON_MEDIA_TYPE}, got ${type === '' ? 'none' : `"${type.slice(0, 100)}"`}`,
    )
  }
  if (request.headers['content-encoding'] !== undefined) {
    throw new InputError('UNSUPPORTED_MEDIA_TYPE', 'Content-Encoding: expected none around JSON, got one')
  }
  const text = request.body instanceof Readable ? await readText(request, request.body, idleMs) : ''
  if (text.trim() === '') throw new InputError('BAD_REQUEST', 'body: expected a JSON document, got none')
  try {
    return JSON.parse(text.replace(/^\uFEFF/, '')) as unknown
  } catch (cause) {
    const got = (cause as Error).message
    throw new InputError('BAD_REQUEST', `body: expected JSON, got text that is none (${got})`, { cause })
  }
}

async function readText(request: FastifyRequest, body: Readable, idleMs: number): Promise<string> {
  const socket = request.raw.socket
  const giveUp = () => {
    socket.destroy()
  }
  socket.setTimeout(idleMs, giveUp)
  try {
    const chunks: Buffer[] = []
    let bytes = 0
    // Left alive when it is too long: there is still an answer to give on its connection.
    for await (const chunk of body.iterator({ destroyOnReturn: false })) {
      bytes += (chunk as Buffer).length
      if (bytes > DOCUMENT_LIMIT_BYTES) {
        throw new InputError(
          'BODY_TOO_LARGE',
          `body: expected at most ${DOCUMENT_LIMIT_BYTES / 1_000_000} MB of JSON, got more`,
        )
      }
      chunks.push(chunk as Buffer)
    }
    return Buffer.concat(chunks).toString('utf8')
  } finally {
    socket.setTimeout(0)
    socket.off('timeout', giveUp)
  }
}
