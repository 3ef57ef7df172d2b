import type { FastifyReply, FastifyRequest } from 'fastify'
import { ERRORS, InputError, type ErrorCode } from '../errors.ts'
import type { Problem } from '../sheet/index.ts'
import { FORM_MEDIA_TYPE, JSON_MEDIA_TYPE, LOG_MEDIA_TYPES } from './media-types.ts'

/**
 * Codes of the framework that are the caller's mistake in this program's words. Every other one below 500 is a BAD_REQUEST.
 */
const FRAMEWORK_CODES: Readonly<Record<string, ErrorCode>> = {
  FST_ERR_CTP_INVALID_MEDIA_TYPE: 'UNSUPPORTED_MEDIA_TYPE',
  FST_ERR_CTP_BODY_TOO_LARGE: 'BODY_TOO_LARGE',
  FST_REQ_FILE_TOO_LARGE: 'LOG_TOO_LARGE',
  FST_INVALID_JSON_FIELD_ERROR: 'BAD_SITE',
  FST_INVALID_MULTIPART_CONTENT_TYPE: 'UNSUPPORTED_MEDIA_TYPE',
  ENOSPC: 'STORAGE_FULL',
  EDQUOT: 'STORAGE_FULL',
}

/** Any error as the caller's mistake, or undefined when it is a fault of this program. */
export function asInputError(error: unknown, contentType?: string): InputError | undefined {
  if (error instanceof InputError) return error
  if (!(error instanceof Error)) return undefined
  const { code, statusCode } = error as Error & { code?: unknown; statusCode?: unknown }
  const known = typeof code === 'string' ? FRAMEWORK_CODES[code] : undefined
  if (known === 'STORAGE_FULL') {
    return new InputError(known, 'data folder: expected room to write, got a full disk', { cause: error })
  }
  if (known === 'UNSUPPORTED_MEDIA_TYPE') {
    const got = contentType === undefined ? 'none' : `"${contentType.slice(0, 100)}"`
    return new InputError(
      known,
      `Content-Type: expected ${JSON_MEDIA_TYPE} for a document, ${[...LOG_MEDIA_TYPES, FORM_MEDIA_TYPE].join(' | ')} for a log, got ${got}`,
      { cause: error },
    )
  }
  if (known !== undefined) return new InputError(known, error.message, { cause: error })
  if (typeof statusCode === 'number' && statusCode >= 400 && statusCode < 500) {
    return new InputError('BAD_REQUEST', error.message, { cause: error })
  }
  return undefined
}

/**
 * Answers with RFC 9457 problem details. A fault of this program is logged with its stack, and answered without.
 *
 * @param hiddenFolder  the data folder: its path never leaves this machine.
 */
export function sendProblem(
  request: FastifyRequest,
  reply: FastifyReply,
  error: unknown,
  hiddenFolder: string,
): FastifyReply {
  const mistake = asInputError(error, request.headers['content-type'])
  if (mistake === undefined) {
    request.log.error({ err: error }, 'fault while answering a request')
  } else {
    request.log.info({ code: mistake.code, detail: mistake.message }, 'request refused')
  }
  const code = mistake?.code ?? 'INTERNAL'
  const { status, title } = ERRORS[code]
  const hide = (text: string) => text.replaceAll(hiddenFolder, '(data folder)')
  const detail =
    mistake === undefined
      ? `a fault of this program; the log of the service tells more under request ${request.id}`
      : hide(mistake.message)
  const problem: Problem = {
    type: `urn:yawledger:problem:${code.toLowerCase().replaceAll('_', '-')}`,
    title,
    status,
    code,
    detail,
    instance: request.url.split('?', 1)[0] ?? '/',
    requestId: request.id,
  }
  if (mistake !== undefined && Object.keys(mistake.detail).length > 0) {
    problem.context = JSON.parse(hide(JSON.stringify(mistake.detail))) as Record<string, unknown>
  }
  if (status === 503) reply.header('retry-after', code === 'BUSY' ? '30' : '5')
  return reply
    .code(status)
    .header('content-type', 'application/problem+json')
    .header('cache-control', 'no-store')
    .header('x-request-id', request.id)
    .send(Buffer.from(JSON.stringify(problem)))
}

/** The `response` part of a route schema for the errors that the route can answer, one entry per status. */
export function problemResponses(codes: readonly ErrorCode[]): Record<number, unknown> {
  const byStatus = new Map<number, ErrorCode[]>()
  for (const code of codes) {
    const { status } = ERRORS[code]
    byStatus.set(status, [...(byStatus.get(status) ?? []), code])
  }
  return Object.fromEntries([...byStatus].map(([status, group]) => [status, problemResponse(group)]))
}

/** One OpenAPI response of problem details, limited to some codes of one status. */
export function problemResponse(codes: readonly ErrorCode[], schemas = 'Problem#'): unknown {
  return {
    description: codes.map((code) => `\`${code}\` ${ERRORS[code].title}`).join('; '),
    content: {
      'application/problem+json': {
        schema: {
          allOf: [
            { $ref: schemas },
            { type: 'object', properties: { code: { type: 'string', enum: [...codes] } } },
          ],
        },
      },
    },
  }
}
