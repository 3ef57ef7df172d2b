import type { FastifyReply, FastifyRequest } from 'fastify'
import { collectDefaultMetrics, Counter, Gauge, Histogram, Registry } from 'prom-client'
import type { ReplayStateName } from '../replay/contract.ts'
import { SERVICE_CODES } from './answers.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

export interface MetricSources {
  /** Replays by state, as the catalogue counts them. */
  readonly replayCounts: () => Promise<Partial<Record<ReplayStateName, number>>>
  /** Requests that wait for their turn to be scored. */
  readonly uploadsWaiting: () => number
}

const STATES: readonly ReplayStateName[] = ['queued', 'running', 'done', 'failed', 'cancelled']

/** Scoring a month takes seconds, a health check less than a millisecond. */
const DURATION_BUCKETS_S = [0.005, 0.02, 0.1, 0.5, 2, 10, 60, 300, 1800]

/** What a monitoring system reads. Labels are names of routes, never addresses: those hold names of sites. */
export interface Metrics {
  /** Rows of one posted log. */
  countRows(rows: { received: number; accepted: number; rejected: number }): void
  /** One answered request. */
  observe(request: FastifyRequest, reply: FastifyReply): void
  text(): Promise<string>
  readonly mediaType: string
}

export function createMetrics(sources: MetricSources): Metrics {
  const registry = new Registry()
  const registers = [registry]
  collectDefaultMetrics({ register: registry })
  const durations = new Histogram({
    name: 'yawledger_http_request_duration_seconds',
    help: 'Time from the head of a request to the end of its answer',
    labelNames: ['method', 'route', 'status'],
    buckets: DURATION_BUCKETS_S,
    registers,
  })
  const rows = new Counter({
    name: 'yawledger_log_rows_total',
    help: 'Rows of posted logs since the start of the process; duplicates are received and neither accepted nor rejected',
    labelNames: ['outcome'],
    registers,
  })
  for (const outcome of ['received', 'accepted', 'rejected']) rows.inc({ outcome }, 0)
  new Gauge({
    name: 'yawledger_replays',
    help: 'Replays that the catalogue holds, by state',
    labelNames: ['state'],
    registers,
    async collect() {
      const counts = await sources.replayCounts()
      for (const state of STATES) this.set({ state }, counts[state] ?? 0)
    },
  })
  new Gauge({
    name: 'yawledger_uploads_waiting',
    help: 'Requests that have come in whole and wait to be read and scored',
    registers,
    collect() {
      this.set(sources.uploadsWaiting())
    },
  })
  return {
    mediaType: registry.contentType,
    text: () => registry.metrics(),
    countRows({ received, accepted, rejected }) {
      rows.inc({ outcome: 'received' }, received)
      rows.inc({ outcome: 'accepted' }, accepted)
      rows.inc({ outcome: 'rejected' }, rejected)
    },
    observe(request, reply) {
      const route = request.routeOptions.url ?? 'unknown'
      const labels = { method: request.method, route, status: String(reply.statusCode) }
      durations.observe(labels, reply.elapsedTime / 1000)
    },
  }
}

export function metricsRoute(app: TypedServer, metrics: Metrics): void {
  app.get(
    '/metrics',
    {
      logLevel: 'warn',
      schema: {
        operationId: 'metrics',
        tags: ['operations'],
        summary: 'Numbers for a monitoring system',
        description:
          'Prometheus text format: process, duration of requests by route and status, replays by state (`queued` is the length of the queue), rows of posted logs.',
        response: {
          200: {
            description: 'Metrics',
            content: { 'text/plain': { schema: { type: 'string' } } },
          },
          ...problemResponses([...SERVICE_CODES]),
        },
      },
    },
    async (_request, reply) => {
      const text = await metrics.text()
      return await (reply as FastifyReply)
        .header('content-type', metrics.mediaType)
        .header('cache-control', 'no-store')
        .send(Buffer.from(text))
    },
  )
}
