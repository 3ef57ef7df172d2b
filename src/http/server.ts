import { randomUUID } from 'node:crypto'
import type { IncomingMessage, ServerResponse } from 'node:http'
import type { Socket } from 'node:net'
import multipart from '@fastify/multipart'
import swagger, { type FastifyDynamicSwaggerOptions } from '@fastify/swagger'
import fastify, { type FastifyBaseLogger, type FastifyReply } from 'fastify'
import { InputError } from '../errors.ts'
import type { Intake } from '../intake/index.ts'
import type { Replays } from '../replay/contract.ts'
import { checkShape, type Setup } from '../setup/index.ts'
import { Problem, ScoreSheet, SiteFile, type ScoringSettings } from '../sheet/index.ts'
import { healthRoutes, type ReadyCheck } from './health-routes.ts'
import { KnownAddresses } from './known-addresses.ts'
import { answerRoutes } from './answer-routes.ts'
import { worklistRoutes } from './worklist-routes.ts'
import { entryRoutes } from './entry-routes.ts'
import { latestSheets } from './latest-sheet.ts'
import { DryRun } from './log-description.ts'
import { logRoutes, StoredLog } from './log-routes.ts'
import { JSON_MEDIA_TYPE, LOG_MEDIA_TYPES } from './media-types.ts'
import { createMetrics, metricsRoute, type MetricSources } from './metrics.ts'
import { documentInfo } from './openapi.ts'
import { sendProblem } from './problem.ts'
import { replayRoutes } from './replay-routes.ts'
import { ReplaySummary } from './replay-summary.ts'
import { rowsRoute } from './rows-route.ts'
import { ScoringGate, SenderGone, type GateLimits } from './scoring-gate.ts'
import { siteRoutes } from './site-routes.ts'
import { trendRoute } from './trend-route.ts'
import type { TypedServer } from './typed-server.ts'
import { FORM_LIMITS, type UploadLimits } from './upload.ts'

export interface ServerParts {
  readonly replays: Replays
  readonly intake: Intake
  readonly setup: Setup
  /** The settings of the service, which a request may override. */
  readonly settings: ScoringSettings
  readonly upload: UploadLimits
  /** How many logs are scored at once, and how many may wait. */
  readonly gate: GateLimits
  readonly replayCounts: MetricSources['replayCounts']
  readonly ready: ReadyCheck
  /** A folder whose path never stands in an answer. */
  readonly dataFolder: string
  /** Version of the program, printed in the description of the interface. */
  readonly version: string
  /** A pino logger, or none to stay silent. */
  readonly logger?: FastifyBaseLogger
}

/** How long a client that was refused may go on sending before the connection is cut, ms. */
const LINGER_MS = 5000

const SANE_REQUEST_ID = /^[\w.:-]{1,100}$/

/** The HTTP service, ready to listen. Closing it lets running requests finish and refuses new ones. */
export async function buildServer(parts: ServerParts): Promise<TypedServer> {
  const hiddenFolder = parts.dataFolder
  const app: TypedServer = fastify({
    ...(parts.logger === undefined ? { logger: false } : { loggerInstance: parts.logger }),
    genReqId: requestId,
    requestIdHeader: false,
    return503OnClosing: false,
    // A name of 100 characters, each of which may be written as %XX of up to four bytes.
    routerOptions: { maxParamLength: 1200 },
    // Slow senders are watched by silence, not by total time: a log of many GB may take an hour.
    requestTimeout: 0,
    frameworkErrors: (error, request, reply) => {
      sendProblem(request, reply, error, hiddenFolder)
    },
    clientErrorHandler: answerBrokenRequest,
  })
  const addresses = new KnownAddresses(app)
  const gate = new ScoringGate(parts.gate)
  const metrics = createMetrics({
    replayCounts: parts.replayCounts,
    uploadsWaiting: () => gate.waiting,
  })
  let closing = false
  app.addHook('preClose', () => {
    closing = true
    return Promise.resolve()
  })

  // Fastify's own serializer turns null into 0 under a number schema. JSON.stringify writes what is not finite as null.
  app.setSerializerCompiler(() => (data) => JSON.stringify(data))
  app.setValidatorCompiler(({ schema, httpPart }) => {
    if (httpPart === 'body') return () => true
    return (data: unknown) => {
      try {
        checkShape(schema as never, data, { code: 'BAD_OPTION', place: '', fromText: true })
        return { value: data }
      } catch (error) {
        return { error: error as Error }
      }
    }
  })

  app.removeAllContentTypeParsers()
  app.addContentTypeParser([...LOG_MEDIA_TYPES, JSON_MEDIA_TYPE], (_request, payload, done) => {
    done(null, payload)
  })
  await app.register(multipart, {
    limits: FORM_LIMITS,
    throwFileSizeLimit: false,
    isPartAFile: (field, type, file) =>
      field === 'log' || file !== undefined || type === 'application/octet-stream',
  })

  app.addHook('onRequest', async (request, reply) => {
    reply.header('x-request-id', request.id)
    reply.header('x-content-type-options', 'nosniff')
    if (closing)
      throw new InputError('NOT_READY', 'service: expected to be running, got one that is stopping')
    return Promise.resolve()
  })
  app.addHook('onResponse', (request, reply) => {
    metrics.observe(request, reply)
    return Promise.resolve()
  })
  app.addHook('onSend', (request, _reply, payload) => {
    lingerOver(request.raw)
    return Promise.resolve(payload)
  })
  app.setErrorHandler((error, request, reply) => {
    if (error instanceof SenderGone || (request.raw.destroyed && !request.raw.complete)) {
      request.log.info({ detail: (error as Error).message }, 'the sender broke off')
      return reply.code(499).send()
    }
    if (error instanceof InputError && error.code === 'UNSUPPORTED_MEDIA_TYPE')
      reply.header('accept-encoding', 'gzip')
    return sendProblem(request, reply, error, hiddenFolder)
  })
  app.setNotFoundHandler((request, reply) => {
    const path = request.url.split('?', 1)[0] ?? '/'
    const refusal = addresses.refusal(request.method, path)
    if (refusal.code === 'METHOD_NOT_ALLOWED') reply.header('allow', addresses.methodsOf(path).join(', '))
    return sendProblem(request, reply, refusal, hiddenFolder)
  })

  const shared = { Problem, ScoreSheet, SiteFile, ReplaySummary, StoredLog, DryRun }
  for (const [name, schema] of Object.entries<object>(shared)) app.addSchema({ ...schema, $id: name })
  const refResolver: FastifyDynamicSwaggerOptions['refResolver'] = {
    buildLocalReference: (json, _base, _fragment, index) => nameOf(json['$id'], index),
  }
  await app.register(swagger, { openapi: documentInfo(parts.version), refResolver })
  const { replays, intake, setup, upload, settings } = parts
  replayRoutes(app, { replays, intake, settings, upload, gate, metrics })
  rowsRoute(app, { replays })
  siteRoutes(app, { setup, idleMs: upload.idleMs })
  entryRoutes(app, { setup, replays, idleMs: upload.idleMs })
  logRoutes(app, { intake, setup, upload, gate, metrics })
  const latest = latestSheets(replays, setup)
  answerRoutes(app, { latest })
  worklistRoutes(app, { latest, setup })
  trendRoute(app, { replays, setup })
  healthRoutes(app, parts.ready)
  metricsRoute(app, metrics)
  app.get('/openapi.json', { schema: { hide: true } }, (_request, reply) =>
    (reply as FastifyReply).header('cache-control', 'no-cache').send(app.swagger()),
  )

  app.server.on('checkContinue', (request: IncomingMessage, response: ServerResponse) => {
    // A body that is too large by its own word is refused before a byte of it is sent.
    const declaredBytes = Number(request.headers['content-length'] ?? 0)
    if (declaredBytes <= parts.upload.bodyLimitBytes) response.writeContinue()
    app.server.emit('request', request, response)
  })
  return app
}

function nameOf(id: unknown, index: number): string {
  return typeof id === 'string' ? id : `schema-${index}`
}

function requestId(request: IncomingMessage): string {
  const given = request.headers['x-request-id']
  return typeof given === 'string' && SANE_REQUEST_ID.test(given) ? given : randomUUID()
}

/**
 * After an early answer the rest of the body is read and dropped for a while. Closing at once would reset the connection, and
 * the client would see the reset instead of the answer.
 */
function lingerOver(request: IncomingMessage): void {
  if (request.complete || request.destroyed) return
  request.unpipe()
  request.resume()
  const timer = setTimeout(() => request.socket.destroy(), LINGER_MS)
  request.once('close', () => {
    clearTimeout(timer)
  })
  request.once('end', () => {
    clearTimeout(timer)
  })
}

/** Bytes that are no HTTP request: there is no request to answer, only a socket. */
function answerBrokenRequest(error: Error & { code?: string }, socket: Socket): void {
  if (error.code === 'ECONNRESET' || socket.destroyed || !socket.writable) {
    socket.destroy()
    return
  }
  const problem: Problem = {
    type: 'urn:yawledger:problem:bad-request',
    title: 'The request cannot be understood',
    status: 400,
    code: 'BAD_REQUEST',
    detail: 'request: expected HTTP/1.1, got bytes that are none',
  }
  const body = JSON.stringify(problem)
  socket.end(
    `HTTP/1.1 400 Bad Request\r\nContent-Type: application/problem+json\r\nContent-Length: ${Buffer.byteLength(body)}\r\nConnection: close\r\n\r\n${body}`,
  )
}
