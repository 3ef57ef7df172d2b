import type { FastifyReply, FastifyRequest } from 'fastify'
import { Type, type TSchema } from 'typebox'
import { InputError, type ErrorCode } from '../errors.ts'
import { entityTag, matchesTag } from './etag.ts'

/** What any route may answer while the service starts, stops or fails. */
export const SERVICE_CODES = ['NOT_READY', 'INTERNAL'] as const satisfies readonly ErrorCode[]

/** What reading a log may come upon. */
export const LOG_CODES = [
  'LOG_EMPTY',
  'LOG_NO_HEADER',
  'LOG_NO_ROWS',
  'LOG_COLUMNS_MISSING',
  'LOG_COLUMN_UNREADABLE',
  'LOG_COLUMN_MAP',
  'LOG_TIME',
  'LOG_UNIT',
  'LOG_LINE_TOO_LONG',
  'LOG_TOO_LARGE',
  'LOG_TOO_MANY_COLUMNS',
  'LOG_TOO_MANY_ROWS',
  'LOG_CORRUPT',
  'BAD_REQUEST',
  'BAD_OPTION',
  'UNSUPPORTED_MEDIA_TYPE',
  'STORAGE_FULL',
  'BUSY',
  'INTERRUPTED',
  ...SERVICE_CODES,
] as const satisfies readonly ErrorCode[]

export const ETAG = { ETag: { schema: { type: 'string' }, description: 'of what is answered' } }
export const NOT_MODIFIED = { 304: { description: 'What is at hand is the same' } }
export const IfNoneMatch = Type.Object({
  'if-none-match': Type.Optional(Type.String({ description: 'ETag of what is at hand' })),
})

export const PageQuery = {
  after: Type.Optional(
    Type.String({ minLength: 1, maxLength: 300, description: '`next` of the page before' }),
  ),
  limit: Type.Optional(
    Type.Integer({ minimum: 1, maximum: 200, default: 50, description: 'most entries of a page' }),
  ),
}
export const Next = Type.Union([Type.String(), Type.Null()], {
  description: 'cursor: give it as `after` to get the next page; null on the last',
})

export const Name = (description: string) => Type.String({ minLength: 1, maxLength: 100, description })
export const SiteParams = Type.Object({ site: Name('name of the site') })
export const TurbineParams = Type.Object({
  site: Name('name of the site'),
  turbine: Name('name of the turbine'),
})

export function pageOf({ after, limit = 50 }: { after?: string; limit?: number }) {
  return after === undefined ? { limit } : { after, limit }
}

/** One JSON answer of a route, as its schema. */
export function jsonResponse(description: string, schema: TSchema | object, headers: object = {}): object {
  return { description, headers, content: { 'application/json': { schema } } }
}

/** JSON with its tag, or 304 when the client has it already. */
export function sendTagged(
  request: FastifyRequest,
  reply: FastifyReply,
  bytes: Buffer | string,
  mediaType = 'application/json; charset=utf-8',
): FastifyReply {
  const buffer = Buffer.from(bytes as string)
  const tag = entityTag(buffer)
  reply.header('etag', tag).header('cache-control', 'no-cache')
  if (reply.statusCode === 200 && matchesTag(request.headers['if-none-match'], tag)) {
    return reply.code(304).send()
  }
  return reply.header('content-type', mediaType).send(buffer)
}

export function sendJson(reply: FastifyReply, value: unknown): FastifyReply {
  return reply
    .header('content-type', 'application/json; charset=utf-8')
    .send(Buffer.from(JSON.stringify(value)))
}

export function isoTime(utcMs: number): string {
  return new Date(utcMs).toISOString()
}

/**
 * Epoch ms of a time that fits its schema. A second 60 does, and is no time that can be counted with.
 * @throws InputError BAD_OPTION
 */
export function timeMs(text: string, place: string): number {
  const ms = Date.parse(text)
  if (!Number.isFinite(ms)) {
    throw new InputError('BAD_OPTION', `${place}: expected a date-time with offset, got "${text}"`)
  }
  return ms
}

/** The address of a resource, with every name encoded. */
export function addressOf(...names: readonly string[]): string {
  return `/v1/${names.map((name) => encodeURIComponent(name)).join('/')}`
}
