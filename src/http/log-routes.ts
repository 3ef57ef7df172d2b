import { createReadStream } from 'node:fs'
import type { FastifyReply, FastifyRequest } from 'fastify'
import { Type, type Static } from 'typebox'
import { InputError } from '../errors.ts'
import type { Intake, StoredBatch } from '../intake/index.ts'
import type { Setup } from '../setup/index.ts'
import { Receipt } from '../sheet/index.ts'
import {
  addressOf,
  ETAG,
  IfNoneMatch,
  isoTime,
  jsonResponse,
  LOG_CODES,
  Name,
  Next,
  NOT_MODIFIED,
  pageOf,
  PageQuery,
  sendJson,
  sendTagged,
  SERVICE_CODES,
  SiteParams,
  timeMs,
  TurbineParams,
} from './answers.ts'
import { logBodies } from './log-bodies.ts'
import type { Metrics } from './metrics.ts'
import { problemResponses } from './problem.ts'
import { LogQuery, readingOptions } from './replay-query.ts'
import type { ScoringGate } from './scoring-gate.ts'
import type { TypedServer } from './typed-server.ts'
import { receiveUpload, type UploadLimits } from './upload.ts'

export interface LogRouteParts {
  readonly intake: Intake
  readonly setup: Setup
  readonly upload: UploadLimits
  readonly gate: ScoringGate
  readonly metrics: Metrics
}

export const StoredLog = Type.Object(
  {
    batch: Type.String({ description: 'id' }),
    site: Type.String(),
    createdAt: Type.String({ format: 'date-time', description: 'when it was taken in' }),
    reading: Type.Record(Type.String(), Type.Unknown(), {
      description: 'how it was read, with what the site file said then',
    }),
    receipt: Receipt,
    href: Type.String(),
    rejectedHref: Type.String({ description: 'its rejected rows as CSV' }),
  },
  { description: 'A stored log and its receipt' },
)

const LogPage = Type.Object(
  { logs: Type.Array(StoredLog, { description: 'newest first' }), next: Next },
  { description: 'A page of stored logs' },
)

const CoverageDays = Type.Object(
  {
    site: Type.String(),
    turbine: Type.String(),
    intervalS: Type.Union([Type.Number(), Type.Null()]),
    days: Type.Array(
      Type.Object({
        day: Type.String({ format: 'date', description: 'UTC' }),
        rows: Type.Integer({ minimum: 0, description: 'rows that count; a time posted twice is one' }),
        expected: Type.Union([Type.Integer({ minimum: 0 }), Type.Null()], {
          description: 'rows of a full day within the window; null when the interval is not known',
        }),
        first: Type.Union([Type.String({ format: 'date-time' }), Type.Null()]),
        last: Type.Union([Type.String({ format: 'date-time' }), Type.Null()]),
      }),
      { description: 'every day of the window, also those without rows' },
    ),
  },
  { description: 'What is there of a turbine, and what is missing' },
)

const BatchParams = Type.Object({ site: Name('name of the site'), batch: Name('id of the stored log') })
const BATCH_CODES = ['BAD_OPTION', 'SITE_NOT_FOUND', 'BATCH_NOT_FOUND', ...SERVICE_CODES] as const
const REJECTED_HEADER = 'file,line,reason,text\n'

/** Logs of a site: taken in, listed, removed; their rejected rows; what is there of a turbine. */
export function logRoutes(app: TypedServer, parts: LogRouteParts): void {
  const { intake } = parts
  app.post(
    '/v1/sites/:site/logs',
    {
      schema: {
        operationId: 'postLog',
        tags: ['logs'],
        summary: 'Store a log',
        description: [
          'Reads the log in the body and keeps its rows under the site, all of it or nothing. The receipt accounts for every line.',
          'A later log wins over an earlier one at the same turbine and time. The same bytes read the same way are answered with the first receipt (200).',
          'A turbine that the site file lacks is added to it, with a warning. The site must have been put before: `PUT /v1/sites/{site}` with `{}` will do.',
          '`dryRun=true` says how the log would be read (200), and stores nothing.',
          '',
          '    curl -X PUT -H "Content-Type: application/json" -d "{}" http://127.0.0.1:8080/v1/sites/quern-hill',
          '    curl --data-binary @march.csv.gz -H "Content-Type: application/gzip" "http://127.0.0.1:8080/v1/sites/quern-hill/logs?name=march.csv.gz"',
        ].join('\n'),
        params: SiteParams,
        querystring: LogQuery,
        body: logBodies({ takesSite: false }),
        response: {
          200: jsonResponse('The same log came before; or how it would be read (`dryRun=true`)', {
            anyOf: [{ $ref: 'StoredLog#' }, { $ref: 'DryRun#' }],
          }),
          201: jsonResponse(
            'Stored',
            { $ref: 'StoredLog#' },
            {
              Location: { schema: { type: 'string' }, description: 'where the receipt is read again' },
            },
          ),
          ...problemResponses(['SITE_NOT_FOUND', ...LOG_CODES]),
        },
      },
    },
    async (request, reply) => await postLog(request, request.params.site, request.query, reply, parts),
  )
  app.get(
    '/v1/sites/:site/logs',
    {
      schema: {
        operationId: 'listLogs',
        tags: ['logs'],
        summary: 'List stored logs with their receipts',
        params: SiteParams,
        querystring: Type.Object(PageQuery, { additionalProperties: false }),
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('A page of stored logs', LogPage, ETAG),
          ...NOT_MODIFIED,
          ...problemResponses(['BAD_OPTION', 'BAD_REQUEST', 'SITE_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const { batches, next } = await intake.list(request.params.site, pageOf(request.query))
      return sendTagged(request, reply, JSON.stringify({ logs: batches.map(storedLog), next }))
    },
  )
  app.get(
    '/v1/sites/:site/logs/:batch',
    {
      schema: {
        operationId: 'readLog',
        tags: ['logs'],
        summary: 'Read the receipt of a stored log',
        params: BatchParams,
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('The log', { $ref: 'StoredLog#' }, ETAG),
          ...NOT_MODIFIED,
          ...problemResponses(BATCH_CODES),
        },
      },
    },
    async (request, reply) => {
      const batch = await intake.get(request.params.site, request.params.batch)
      return sendTagged(request, reply, JSON.stringify(storedLog(batch)))
    },
  )
  app.delete(
    '/v1/sites/:site/logs/:batch',
    {
      schema: {
        operationId: 'removeLog',
        tags: ['logs'],
        summary: 'Remove a stored log',
        description: 'Rows of older logs that it overruled count again.',
        params: BatchParams,
        response: { 204: { description: 'Removed' }, ...problemResponses(BATCH_CODES) },
      },
    },
    async (request, reply) => {
      await intake.remove(request.params.site, request.params.batch)
      return await (reply as FastifyReply).code(204).send()
    },
  )
  app.get(
    '/v1/sites/:site/logs/:batch/rejected',
    {
      schema: {
        operationId: 'readRejected',
        tags: ['logs'],
        summary: 'Read the rejected rows of a log',
        description: 'file, line, reason, text of each; the header alone when there are none.',
        params: BatchParams,
        response: {
          200: { description: 'CSV', content: { 'text/csv': { schema: { type: 'string' } } } },
          ...problemResponses(BATCH_CODES),
        },
      },
    },
    async (request, reply) => {
      const { site, batch } = request.params
      const path = await intake.rejectedPath(site, batch)
      reply.header('content-type', 'text/csv; charset=utf-8').header('cache-control', 'no-cache')
      const content = path === null ? Buffer.from(REJECTED_HEADER) : createReadStream(path)
      return (reply as FastifyReply).send(content)
    },
  )
  app.get(
    '/v1/sites/:site/turbines/:turbine/coverage',
    {
      schema: {
        operationId: 'coverage',
        tags: ['logs'],
        summary: 'What is there of a turbine, and what is missing',
        params: TurbineParams,
        querystring: Type.Object(
          {
            from: Type.Optional(
              Type.String({ format: 'date-time', description: 'default: the first row of the turbine' }),
            ),
            to: Type.Optional(
              Type.String({ format: 'date-time', description: 'default: just after its last row' }),
            ),
          },
          { additionalProperties: false },
        ),
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('Rows day by day', CoverageDays, ETAG),
          ...NOT_MODIFIED,
          ...problemResponses([
            'BAD_OPTION',
            'BAD_REQUEST',
            'SITE_NOT_FOUND',
            'TURBINE_NOT_FOUND',
            ...SERVICE_CODES,
          ]),
        },
      },
    },
    async (request, reply) => {
      const { site, turbine } = request.params
      const { from, to } = request.query
      const found = await intake.coverage(site, turbine, {
        ...(from === undefined ? {} : { fromMs: timeMs(from, 'from') }),
        ...(to === undefined ? {} : { toMs: timeMs(to, 'to') }),
      })
      return sendTagged(request, reply, JSON.stringify(found))
    },
  )
}

async function postLog(
  request: FastifyRequest,
  site: string,
  query: LogQuery,
  reply: FastifyReply,
  { intake, setup, upload: limits, gate, metrics }: LogRouteParts,
): Promise<FastifyReply> {
  const reading = readingOptions(query)
  // Asked before the body is taken: a gigabyte for a site with a typing error in its name helps nobody.
  const file = await setup.getSite(site).catch(sayHowToPut)
  const place = gate.admit(request)
  try {
    const upload = await receiveUpload(request, limits, { takesSite: false, name: query.name })
    try {
      const { logs } = upload
      if (query.dryRun === true) {
        return await sendJson(reply, { logs: await place.run(() => intake.describe(logs, reading, file)) })
      }
      const { batch, isNew } = await place.run(() => intake.post(site, logs, reading))
      const stored = storedLog(batch)
      if (isNew) {
        metrics.countRows(batch.receipt)
        reply.code(201).header('location', stored.href)
      }
      return await sendJson(reply, stored)
    } finally {
      await upload.remove()
    }
  } finally {
    place.leave()
  }
}

function sayHowToPut(error: unknown): never {
  if (!(error instanceof InputError && error.code === 'SITE_NOT_FOUND')) throw error
  const how = 'put it first: PUT /v1/sites/{site} with its site file, or with {}'
  throw new InputError(error.code, `${error.message}; ${how}`, { cause: error })
}

function storedLog(batch: StoredBatch): Static<typeof StoredLog> {
  const href = addressOf('sites', batch.site, 'logs', batch.batch)
  return {
    batch: batch.batch,
    site: batch.site,
    createdAt: isoTime(batch.createdMs),
    reading: batch.reading,
    receipt: batch.receipt,
    href,
    rejectedHref: `${href}/rejected`,
  }
}
