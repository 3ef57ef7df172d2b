import type { FastifyReply, FastifyRequest } from 'fastify'
import { Type } from 'typebox'
import type { ErrorCode } from '../errors.ts'
import type { ReplayRecord, Replays } from '../replay/contract.ts'
import { ReplayState, type ScoringSettings } from '../sheet/index.ts'
import { entityTag, matchesTag } from './etag.ts'
import { LOG_MEDIA_TYPES } from './media-types.ts'
import { problemResponses } from './problem.ts'
import { ReplayQuery, replayOptions } from './replay-query.ts'
import type { TypedServer } from './typed-server.ts'
import { receiveUpload, type UploadLimits } from './upload.ts'

export interface ReplayRouteParts {
  readonly replays: Replays
  /** The settings of the service, which a query may override. */
  readonly settings: ScoringSettings
  readonly upload: UploadLimits
}

const Time = (description: string) => Type.String({ format: 'date-time', description })

export const ReplaySummary = Type.Object(
  {
    replay: Type.String({ description: 'id' }),
    state: ReplayState,
    site: Type.Union([Type.String(), Type.Null()]),
    createdAt: Time('when it was posted'),
    finishedAt: Type.Union([Time('when it ended'), Type.Null()], { description: 'null while it runs' }),
    problem: Type.Union([Type.Object({ code: Type.String(), detail: Type.String() }), Type.Null()], {
      description: 'why it failed; null otherwise',
    }),
    href: Type.String({ description: 'where its score sheet or state is read' }),
  },
  { description: 'State of a replay' },
)

const ReplayPage = Type.Object(
  {
    replays: Type.Array(ReplaySummary, { description: 'newest first' }),
    next: Type.Union([Type.String(), Type.Null()], {
      description: 'cursor: give it as `after` to get the next page; null on the last',
    }),
  },
  { description: 'A page of replays' },
)

const SERVICE_CODES = ['NOT_READY', 'INTERNAL'] as const satisfies readonly ErrorCode[]

const POST_CODES = [
  'LENGTH_MISMATCH',
  'NEGATIVE_WEIGHT',
  'OUT_OF_RANGE',
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
  'BAD_SITE',
  'UNSUPPORTED_MEDIA_TYPE',
  'STORAGE_FULL',
  'INTERRUPTED',
  ...SERVICE_CODES,
] as const satisfies readonly ErrorCode[]

const ETAG = { ETag: { schema: { type: 'string' }, description: 'of the score sheet' } }
const IdParams = Type.Object({
  id: Type.String({ minLength: 1, maxLength: 100, description: 'id of the replay' }),
})

/** POST, GET and DELETE of /v1/replays. */
export function replayRoutes(app: TypedServer, parts: ReplayRouteParts): void {
  app.post(
    '/v1/replays',
    {
      schema: {
        operationId: 'scoreLog',
        tags: ['replays'],
        summary: 'Score a posted log',
        description: [
          'Reads the log in the body, scores every turbine in it and answers the score sheet; no set-up is needed.',
          'Delimiter, encoding, header names and units are recognised, and the receipt in the sheet says how each column was taken and where every row went.',
          'The sheet is kept and read again under the address in `Location`, byte for byte.',
          '',
          '    curl --data-binary @log.csv -H "Content-Type: text/csv" "http://127.0.0.1:8080/v1/replays?timezone=Europe/Berlin"',
          '    curl -F site=@farm.site.json -F log=@log.csv.gz http://127.0.0.1:8080/v1/replays',
        ].join('\n'),
        querystring: ReplayQuery,
        body: requestBodies(),
        response: {
          201: {
            description: 'Scored',
            headers: {
              ...ETAG,
              Location: { schema: { type: 'string' }, description: 'where the score sheet is read again' },
            },
            content: { 'application/json': { schema: { $ref: 'ScoreSheet#' } } },
          },
          ...problemResponses(POST_CODES),
        },
      },
    },
    async (request, reply) => {
      const options = replayOptions(request.query, parts.settings)
      const upload = await receiveUpload(request, parts.upload)
      try {
        const sheet = await parts.replays.oneShot({ logs: upload.logs, site: upload.site, ...options })
        const record = await parts.replays.get(sheet.replay)
        if (record.sheet === null) throw new Error(`replay ${sheet.replay} is scored and has no sheet`)
        const bytes = Buffer.from(record.sheet)
        return await reply
          .code(201)
          .header('location', href(sheet.replay))
          .header('etag', entityTag(bytes))
          .header('content-type', 'application/json; charset=utf-8')
          .send(bytes)
      } finally {
        await upload.remove()
      }
    },
  )

  app.get(
    '/v1/replays/:id',
    {
      schema: {
        operationId: 'readReplay',
        tags: ['replays'],
        summary: 'Read a score sheet',
        description:
          'The score sheet, byte for byte as it was first answered. A replay that is not done answers its state instead: an object with `state` and no `turbines`.',
        params: IdParams,
        headers: Type.Object({
          'if-none-match': Type.Optional(Type.String({ description: 'ETag of the sheet that is at hand' })),
        }),
        response: {
          200: {
            description: 'The score sheet, or the state of a replay that is not done',
            headers: ETAG,
            content: {
              'application/json': {
                schema: { anyOf: [{ $ref: 'ScoreSheet#' }, { $ref: 'ReplaySummary#' }] },
              },
            },
          },
          304: { description: 'The sheet at hand is the same' },
          ...problemResponses(['BAD_OPTION', 'REPLAY_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const record = await parts.replays.get(request.params.id)
      if (record.sheet === null) {
        return await sendJson(reply.header('cache-control', 'no-store'), summary(record))
      }
      return await sendTagged(request, reply, Buffer.from(record.sheet))
    },
  )

  app.get(
    '/v1/replays',
    {
      schema: {
        operationId: 'listReplays',
        tags: ['replays'],
        summary: 'List replays',
        description: 'Newest first, one page at a time.',
        querystring: Type.Object(
          {
            after: Type.Optional(
              Type.String({ minLength: 1, maxLength: 200, description: '`next` of the page before' }),
            ),
            limit: Type.Optional(
              Type.Integer({ minimum: 1, maximum: 200, default: 50, description: 'most replays of a page' }),
            ),
          },
          { additionalProperties: false },
        ),
        response: {
          200: {
            description: 'A page of replays',
            headers: ETAG,
            content: { 'application/json': { schema: ReplayPage } },
          },
          304: { description: 'The page at hand is the same' },
          ...problemResponses(['BAD_OPTION', 'BAD_REQUEST', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const { after, limit = 50 } = request.query
      const page = await parts.replays.list(after === undefined ? { limit } : { after, limit })
      const json = JSON.stringify({ replays: page.replays.map(summary), next: page.next })
      return await sendTagged(request, reply, Buffer.from(json))
    },
  )

  app.delete(
    '/v1/replays/:id',
    {
      schema: {
        operationId: 'removeReplay',
        tags: ['replays'],
        summary: 'Remove a replay',
        description: 'Removes its score sheet and its rows.',
        params: IdParams,
        response: {
          204: { description: 'Removed' },
          ...problemResponses(['BAD_OPTION', 'REPLAY_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      await parts.replays.remove(request.params.id)
      return await (reply as FastifyReply).code(204).send()
    },
  )
}

/** The body is a stream that no validator may read: the schema describes it, and upload.ts checks it. */
function requestBodies(): { content: Record<string, { schema: object }> } {
  const log = {
    type: 'string',
    format: 'binary',
    description: 'the log; may be gzip, by itself or by Content-Encoding',
  }
  const form = {
    type: 'object',
    required: ['log'],
    properties: {
      site: { $ref: 'SiteFile#' },
      log: {
        type: 'array',
        minItems: 1,
        items: { type: 'string', format: 'binary' },
        description: 'one part each',
      },
    },
  }
  const plain = LOG_MEDIA_TYPES.map((type) => [type, { schema: log }] as const)
  return { content: { ...Object.fromEntries(plain), 'multipart/form-data': { schema: form } } }
}

function href(id: string): string {
  return `/v1/replays/${encodeURIComponent(id)}`
}

function summary(record: ReplayRecord) {
  return {
    replay: record.id,
    state: record.state,
    site: record.site,
    createdAt: isoTime(record.createdMs),
    finishedAt: record.finishedMs === null ? null : isoTime(record.finishedMs),
    problem: record.problem,
    href: href(record.id),
  }
}

function isoTime(utcMs: number): string {
  return new Date(utcMs).toISOString()
}

function sendTagged(request: FastifyRequest, reply: FastifyReply, bytes: Buffer): FastifyReply {
  const tag = entityTag(bytes)
  reply.header('etag', tag).header('cache-control', 'no-cache')
  if (matchesTag(request.headers['if-none-match'], tag)) return reply.code(304).send()
  return reply.header('content-type', 'application/json; charset=utf-8').send(bytes)
}

function sendJson(reply: FastifyReply, value: unknown): FastifyReply {
  return reply
    .header('content-type', 'application/json; charset=utf-8')
    .send(Buffer.from(JSON.stringify(value)))
}
