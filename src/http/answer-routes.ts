import type { FastifyReply, FastifyRequest } from 'fastify'
import { Type, type TSchema } from 'typebox'
import { InputError, type ErrorCode } from '../errors.ts'
import type { Setup } from '../setup/index.ts'
import { ScoreSheet, TurbineSheet, WorklistEntry } from '../sheet/index.ts'
import { flatRow, toCsv, worklistRows, type TableRow } from '../sheet/tables.ts'
import { unsettledTurbines, workOrder } from '../sheet/work-order.ts'
import { acceptedType } from './accept.ts'
import {
  ETAG,
  IfNoneMatch,
  NOT_MODIFIED,
  sendTagged,
  SERVICE_CODES,
  SiteParams,
  TurbineParams,
} from './answers.ts'
import type { LatestSheets } from './latest-sheet.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

export interface AnswerRouteParts {
  readonly latest: LatestSheets
  readonly setup: Setup
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
    parts: ['energyLoss'],
    tables: { band: ({ energyLoss }) => energyLoss.band },
  },
  {
    path: 'sensors',
    operationId: 'sensors',
    summary: 'What was found at the sensors',
    parts: ['sensors'],
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
  worklistRoute(app, parts)
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

const Unsettled = Type.Object({ turbine: Type.String(), reason: Type.String() })

function worklistRoute(app: TypedServer, { latest, setup }: AnswerRouteParts): void {
  app.get(
    '/v1/sites/:site/worklist',
    {
      schema: {
        operationId: 'worklist',
        tags: ['answers'],
        summary: 'Who to climb first',
        description:
          'From the newest finished replay of the site. `unsettled` names the turbines that came to no verdict or were not in that replay: they are not on the list, and not aligned either. `text/plain` is a work order with every caution.',
        params: SiteParams,
        headers: IfNoneMatch,
        response: {
          200: {
            description: 'The worklist, first rank first',
            headers: ETAG,
            content: {
              'application/json': {
                schema: Type.Object({
                  replay: Type.String(),
                  site: Type.String(),
                  window: ScoreSheet.properties.window,
                  worklist: Type.Array(WorklistEntry),
                  unsettled: Type.Array(Unsettled),
                }),
              },
              ...CSV_CONTENT,
              'text/plain': { schema: { type: 'string' } },
            },
          },
          ...NOT_MODIFIED,
          ...problemResponses(CODES),
        },
      },
    },
    async (request, reply) => {
      const type = acceptedType(request, ['application/json', 'text/csv', 'text/plain'])
      const { site } = request.params
      const sheet = await latest.ofSite(site)
      reply.header('vary', 'accept')
      const { replay, window, worklist } = sheet
      if (type === 'text/csv') return sendCsv(request, reply, worklistRows(worklist), ['rank', 'turbine'])
      const answer = { replay, site, window, worklist, unsettled: await unsettledOf(site, sheet, setup) }
      return type === 'text/plain'
        ? sendTagged(request, reply, workOrder(answer), 'text/plain; charset=utf-8')
        : sendTagged(request, reply, JSON.stringify(answer))
    },
  )
}

/** Turbines of the sheet without a verdict, and turbines of the site that the sheet does not hold. */
async function unsettledOf(site: string, sheet: ScoreSheet, setup: Setup) {
  // A log that was posted by itself may name a site that was never set up.
  const file = await setup.getSite(site).catch((error: unknown) => {
    if (error instanceof InputError && error.code === 'SITE_NOT_FOUND') return {}
    throw error
  })
  return unsettledTurbines(sheet, file)
}

function sendCsv(
  request: FastifyRequest,
  reply: FastifyReply,
  rows: readonly TableRow[],
  columns: readonly string[],
): FastifyReply {
  return sendTagged(request, reply, toCsv(rows, columns), 'text/csv; charset=utf-8')
}
