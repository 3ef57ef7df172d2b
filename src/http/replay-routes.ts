import type { FastifyReply, FastifyRequest } from 'fastify'
import { Type } from 'typebox'
import type { Intake } from '../intake/index.ts'
import type { Replays } from '../replay/contract.ts'
import { ReplayState, type ScoreSheet, type ScoringSettings } from '../sheet/index.ts'
import {
  ETAG,
  IfNoneMatch,
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
} from './answers.ts'
import { entityTag } from './etag.ts'
import { receiveJson } from './json-body.ts'
import { DryRun } from './log-description.ts'
import { jsonBody, logBodies } from './log-bodies.ts'
import { bareMediaType, JSON_MEDIA_TYPE } from './media-types.ts'
import type { Metrics } from './metrics.ts'
import { problemResponses } from './problem.ts'
import { ReplayQuery, replayOptions } from './replay-query.ts'
import { replayAddress, ReplaySummary, replaySummary } from './replay-summary.ts'
import type { ScoringGate } from './scoring-gate.ts'
import { StoredReplay, storedRequest } from './stored-replay.ts'
import type { TypedServer } from './typed-server.ts'
import { receiveUpload, type UploadLimits } from './upload.ts'

export interface ReplayRouteParts {
  readonly replays: Replays
  readonly intake: Intake
  /** The settings of the service, which a request may override. */
  readonly settings: ScoringSettings
  readonly upload: UploadLimits
  readonly gate: ScoringGate
  readonly metrics: Metrics
}

/** Seconds after which a replay in the background is worth another look. */
const LOOK_AGAIN_S = '2'

const ReplayPage = Type.Object(
  { replays: Type.Array(ReplaySummary, { description: 'newest first' }), next: Next },
  { description: 'A page of replays' },
)

const IdParams = Type.Object({ id: Name('id of the replay') })

const LOCATION = {
  Location: { schema: { type: 'string' }, description: 'where the score sheet is read again' },
}

/** POST, GET and DELETE of /v1/replays. */
export function replayRoutes(app: TypedServer, parts: ReplayRouteParts): void {
  app.post(
    '/v1/replays',
    {
      schema: {
        operationId: 'score',
        tags: ['replays'],
        summary: 'Score a posted log, or stored ones',
        description: [
          'A log as body: it is read, every turbine in it is scored and the score sheet is the answer; no set-up is needed.',
          'Delimiter, encoding, header names and units are recognised, and the receipt in the sheet says how each column was taken and where every row went.',
          'The sheet is kept and read again under the address in `Location`, byte for byte.',
          '`dryRun=true` says how the log would be read (200), and does nothing else.',
          '',
          '    curl --data-binary @log.csv -H "Content-Type: text/csv" "http://127.0.0.1:8080/v1/replays?timezone=Europe/Berlin"',
          '    curl -F site=@farm.site.json -F log=@log.csv.gz http://127.0.0.1:8080/v1/replays',
          '',
          'JSON as body: the logs that are stored for a site are scored over a window. With `Prefer: respond-async` the answer is 202 and the address to look at.',
          '',
          '    curl -H "Content-Type: application/json" -d \'{"site":"quern-hill","from":"2026-03-01T00:00:00Z","to":"2026-04-01T00:00:00Z"}\' http://127.0.0.1:8080/v1/replays',
        ].join('\n'),
        querystring: ReplayQuery,
        headers: Type.Object({
          prefer: Type.Optional(
            Type.String({
              description: '`respond-async`: stored logs are scored in the background (RFC 7240)',
            }),
          ),
        }),
        body: {
          content: { ...jsonBody(StoredReplay).content, ...logBodies({ takesSite: true }).content },
        },
        response: {
          200: jsonResponse('How the logs would be read (`dryRun=true`)', DryRun),
          201: jsonResponse('Scored', { $ref: 'ScoreSheet#' }, { ...ETAG, ...LOCATION }),
          202: jsonResponse(
            'Taken into the queue',
            { $ref: 'ReplaySummary#' },
            {
              ...LOCATION,
              'Preference-Applied': { schema: { type: 'string' }, description: '`respond-async`' },
              'Retry-After': { schema: { type: 'string' }, description: 'seconds' },
            },
          ),
          ...problemResponses([
            'LENGTH_MISMATCH',
            'NEGATIVE_WEIGHT',
            'OUT_OF_RANGE',
            'BAD_SITE',
            'SITE_NOT_FOUND',
            'TURBINE_NOT_FOUND',
            'BODY_TOO_LARGE',
            ...LOG_CODES,
          ]),
        },
      },
    },
    async (request, reply) => {
      const type = bareMediaType(request.headers['content-type'])
      return type === JSON_MEDIA_TYPE
        ? await scoreStored(request, reply, parts)
        : await scoreLog(request, request.query, reply, parts)
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
          'The score sheet, byte for byte as it was first answered. A replay that is not done answers its state instead: an object with `state` and no `turbines`; while it waits or runs, `Retry-After` says when to look again.',
        params: IdParams,
        headers: IfNoneMatch,
        response: {
          200: jsonResponse(
            'The score sheet, or the state of a replay that is not done',
            { anyOf: [{ $ref: 'ScoreSheet#' }, { $ref: 'ReplaySummary#' }] },
            ETAG,
          ),
          ...NOT_MODIFIED,
          ...problemResponses(['BAD_OPTION', 'REPLAY_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const record = await parts.replays.get(request.params.id)
      if (record.sheet !== null) return await sendTagged(request, reply, record.sheet)
      if (record.state === 'queued' || record.state === 'running') reply.header('retry-after', LOOK_AGAIN_S)
      return await sendJson(reply.header('cache-control', 'no-store'), replaySummary(record))
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
            ...PageQuery,
            site: Type.Optional(Name('only replays of this site')),
            state: Type.Optional(ReplayState),
          },
          { additionalProperties: false },
        ),
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('A page of replays', ReplayPage, ETAG),
          ...NOT_MODIFIED,
          ...problemResponses(['BAD_OPTION', 'BAD_REQUEST', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const { site, state } = request.query
      const page = await parts.replays.list({
        ...pageOf(request.query),
        ...(site === undefined ? {} : { site }),
        ...(state === undefined ? {} : { state }),
      })
      const json = JSON.stringify({ replays: page.replays.map(replaySummary), next: page.next })
      return await sendTagged(request, reply, json)
    },
  )

  app.delete(
    '/v1/replays/:id',
    {
      schema: {
        operationId: 'removeReplay',
        tags: ['replays'],
        summary: 'Cancel or remove a replay',
        description:
          'One that waits or runs is cancelled, and its state stays to be read. Any other one is removed with its score sheet and its rows.',
        params: IdParams,
        response: {
          204: { description: 'Cancelled or removed' },
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

async function scoreLog(
  request: FastifyRequest,
  query: ReplayQuery,
  reply: FastifyReply,
  parts: ReplayRouteParts,
): Promise<FastifyReply> {
  const options = replayOptions(query, parts.settings)
  const place = parts.gate.admit(request)
  try {
    const upload = await receiveUpload(request, parts.upload, { takesSite: true, name: query.name })
    try {
      const { logs, site } = upload
      if (query.dryRun === true) {
        const described = await place.run(() => parts.intake.describe(logs, options.reading, site))
        return await sendJson(reply, { logs: described })
      }
      const sheet = await place.run(() => parts.replays.oneShot({ logs, site, ...options }))
      parts.metrics.countRows(sheet.rows)
      return await sendSheet(reply, parts, sheet)
    } finally {
      await upload.remove()
    }
  } finally {
    place.leave()
  }
}

async function scoreStored(
  request: FastifyRequest,
  reply: FastifyReply,
  parts: ReplayRouteParts,
): Promise<FastifyReply> {
  const stored = storedRequest(await receiveJson(request, parts.upload.idleMs), parts.settings)
  if (prefersAsync(request.headers['prefer'])) {
    const { id } = await parts.replays.start(stored)
    const record = await parts.replays.get(id)
    reply
      .code(202)
      .header('location', replayAddress(id))
      .header('preference-applied', 'respond-async')
      .header('retry-after', LOOK_AGAIN_S)
    return sendJson(reply, replaySummary(record))
  }
  const place = parts.gate.admit(request)
  try {
    return await sendSheet(reply, parts, await place.run(() => parts.replays.stored(stored)))
  } finally {
    place.leave()
  }
}

/** The sheet as it is kept, so that reading it again gives the same bytes. */
async function sendSheet(
  reply: FastifyReply,
  parts: ReplayRouteParts,
  { replay }: ScoreSheet,
): Promise<FastifyReply> {
  const { sheet } = await parts.replays.get(replay)
  if (sheet === null) throw new Error(`replay ${replay} is scored and has no sheet`)
  const bytes = Buffer.from(sheet)
  return reply
    .code(201)
    .header('location', replayAddress(replay))
    .header('etag', entityTag(bytes))
    .header('content-type', 'application/json; charset=utf-8')
    .send(bytes)
}

function prefersAsync(header: string | string[] | undefined): boolean {
  const preferences = [header ?? []].flat().join(',').split(',')
  return preferences.some((one) => /^\s*respond-async\s*(;|$)/i.test(one))
}
