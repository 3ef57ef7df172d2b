import type { FastifyReply, FastifyRequest } from 'fastify'
import { Type, type TSchema } from 'typebox'
import type { ErrorCode } from '../errors.ts'
import { ScoreSheet, TurbineSheet } from '../sheet/index.ts'
import { flatRow, toCsv, type TableRow } from '../sheet/tables.ts'
import { acceptedType } from './accept.ts'
import { ETAG, IfNoneMatch, NOT_MODIFIED, sendTagged, SERVICE_CODES, TurbineParams } from './answers.ts'
import type { LatestSheets } from './latest-sheet.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

export interface AnswerRouteParts {
  readonly latest: LatestSheets
}

type Part = keyof TurbineSheet
type Table = (turbine: TurbineSheet) => readonly object[]

interface Question {
  readonly path: string
  readonly operationId: string
  readonly summary: string
  readonly parts: readonly Part[]
  /** Tables that are to be had as CSV, the usual one first. */
  readonly tables: Readonly<Record<string, Table>>
}

const QUESTIONS: readonly Question[] = [
  {
    path: 'yaw-error',
    operationId: 'yawError',
    summary: 'How the yaw error is spread',
    parts: ['vane', 'yawError', 'score', 'scoreAt10min', 'scoreWithinInterval'],
    tables: {
      byWindSpeed: ({ yawError }) => yawError.byWindSpeed,
      byDirection: ({ yawError }) => yawError.byDirection,
    },
  },
  {
    path: 'static-offset',
    operationId: 'staticOffset',
    summary: 'By how much the rotor stands off the wind',
    parts: ['staticOffset', 'advice', 'cautions'],
    tables: {
      bins: ({ staticOffset }) => staticOffset.bins,
      estimates: ({ staticOffset }) => staticOffset.estimates,
      byExponent: ({ staticOffset }) => staticOffset.byExponent,
      changes: ({ staticOffset }) => staticOffset.changes,
    },
  },
  {
    path: 'energy-loss',
    operationId: 'energyLoss',
    summary: 'What the misalignment costs',
    parts: ['energyLoss', 'outlook', 'cautions'],
    tables: {
      band: ({ energyLoss }) => energyLoss.band,
      byMeanWindSpeed: ({ energyLoss }) => energyLoss.yearAhead.byMeanWindSpeed,
      byMisalignment: ({ energyLoss }) => energyLoss.static.byMisalignment,
    },
  },
  {
    path: 'sensors',
    operationId: 'sensors',
    summary: 'What was found at the sensors',
    parts: ['sensors', 'cautions'],
    tables: { sensors: ({ sensors }) => sensors },
  },
  {
    path: 'yaw-activity',
    operationId: 'yawActivity',
    summary: 'How the yaw drive works',
    parts: ['yawActivity'],
    tables: {
      yawActivity: ({ yawActivity }) => Object.entries(yawActivity).map(([name, value]) => ({ name, value })),
    },
  },
]

const CODES = [
  'BAD_OPTION',
  'BAD_REQUEST',
  'SITE_NOT_FOUND',
  'REPLAY_NOT_FOUND',
  'NOT_ACCEPTABLE',
  ...SERVICE_CODES,
] as const satisfies readonly ErrorCode[]

const sheetParts = TurbineSheet.properties as Record<string, TSchema>
const CSV_CONTENT = { 'text/csv': { schema: { type: 'string' } } }

/** The latest answers of a site, for dashboards. */
export function answerRoutes(app: TypedServer, parts: AnswerRouteParts): void {
  for (const question of QUESTIONS) questionRoute(app, parts, question)
}

function questionRoute(app: TypedServer, { latest }: AnswerRouteParts, question: Question): void {
  const names = Object.keys(question.tables)
  const Answer = Type.Object({
    replay: Type.String({ description: 'the replay it is taken from' }),
    site: Type.String(),
    turbine: Type.String(),
    window: ScoreSheet.properties.window,
    verdict: TurbineSheet.properties.verdict,
    reason: TurbineSheet.properties.reason,
    ...Object.fromEntries(question.parts.map((part) => [part, sheetParts[part] as TSchema])),
  })
  app.get(
    `/v1/sites/:site/turbines/:turbine/${question.path}`,
    {
      schema: {
        operationId: question.operationId,
        tags: ['answers'],
        summary: question.summary,
        description: `From the newest finished replay of the site that holds the turbine. As CSV: the table \`${names.join('`, `')}\`.`,
        params: TurbineParams,
        querystring: Type.Object(
          {
            table: Type.Optional(
              Type.Union(
                names.map((name) => Type.Literal(name)),
                { description: `which table CSV gives; default ${names[0] ?? ''}` },
              ),
            ),
          },
          { additionalProperties: false },
        ),
        headers: IfNoneMatch,
        response: {
          200: {
            description: 'The answer',
            headers: ETAG,
            content: { 'application/json': { schema: Answer }, ...CSV_CONTENT },
          },
          ...NOT_MODIFIED,
          ...problemResponses(['TURBINE_NOT_FOUND', ...CODES]),
        },
      },
    },
    async (request, reply) => {
      const type = acceptedType(request, ['application/json', 'text/csv'])
      const { site } = request.params
      const found = await latest.ofTurbine(site, request.params.turbine)
      reply.header('vary', 'accept')
      if (type === 'text/csv') {
        const name = (request.query as { table?: string }).table ?? names[0] ?? ''
        const rows = question.tables[name]?.(found.turbine) ?? []
        return sendCsv(request, reply, rows.map(flatRow), [name])
      }
      const { sheet, turbine } = found
      const { replay, window } = sheet
      const answer = {
        replay,
        site,
        turbine: turbine.turbine,
        window,
        verdict: turbine.verdict,
        reason: turbine.reason,
        ...Object.fromEntries(question.parts.map((part) => [part, turbine[part]])),
      }
      return sendTagged(request, reply, JSON.stringify(answer))
    },
  )
}

function sendCsv(
  request: FastifyRequest,
  reply: FastifyReply,
  rows: readonly TableRow[],
  columns: readonly string[],
): FastifyReply {
  return sendTagged(request, reply, toCsv(rows, columns), 'text/csv; charset=utf-8')
}
