import { FORM_MEDIA_TYPE, LOG_MEDIA_TYPES } from './media-types.ts'

/** A body that is a stream no validator may read: the schema describes it, and upload.ts checks it. */
export function logBodies(options: { takesSite: boolean }): { content: Record<string, { schema: object }> } {
  const log = {
    type: 'string',
    format: 'binary',
    description: 'the log; may be gzip, by itself or by Content-Encoding',
  }
  const form = {
    type: 'object',
    required: ['log'],
    properties: {
      ...(options.takesSite ? { site: { $ref: 'SiteFile#' } } : {}),
      log: {
        type: 'array',
        minItems: 1,
        items: { type: 'string', format: 'binary' },
        description: 'one part each',
      },
    },
  }
  const plain = LOG_MEDIA_TYPES.map((type) => [type, { schema: log }] as const)
  return { content: { ...Object.fromEntries(plain), [FORM_MEDIA_TYPE]: { schema: form } } }
}

/** A JSON body, described; the route checks it. */
export function jsonBody(schema: object): { content: Record<string, { schema: object }> } {
  return { content: { 'application/json': { schema } } }
}
