import type { FastifyReply, FastifyRequest } from 'fastify'
import { Type } from 'typebox'
import { InputError, type ErrorCode } from '../errors.ts'
import type { Setup } from '../setup/index.ts'
import { ScoreSheet, Unsettled, WorklistEntry } from '../sheet/index.ts'
import { toCsv, worklistRows, type TableRow } from '../sheet/tables.ts'
import { fleetOrder, rankedOverSites, unsettledTurbines, workOrder } from '../sheet/work-order.ts'
import { acceptedType } from './accept.ts'
import { ETAG, IfNoneMatch, NOT_MODIFIED, sendTagged, SERVICE_CODES, SiteParams } from './answers.ts'
import type { LatestSheets } from './latest-sheet.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

export interface WorklistRouteParts {
  readonly latest: LatestSheets
  readonly setup: Setup
}

const CODES = [
  'BAD_REQUEST',
  'SITE_NOT_FOUND',
  'REPLAY_NOT_FOUND',
  'NOT_ACCEPTABLE',
  ...SERVICE_CODES,
] as const satisfies readonly ErrorCode[]
const FLEET_CODES = [
  'BAD_REQUEST',
  'NOT_ACCEPTABLE',
  ...SERVICE_CODES,
] as const satisfies readonly ErrorCode[]

const TYPES = ['application/json', 'text/csv', 'text/plain'] as const
const TEXTS = {
  'text/csv': { schema: { type: 'string' } },
  'text/plain': { schema: { type: 'string' } },
}
const SITES_A_PAGE = 200

const SiteAnswer = Type.Object({
  replay: Type.String(),
  site: Type.String(),
  window: ScoreSheet.properties.window,
  worklist: Type.Array(WorklistEntry),
  unsettled: Type.Array(Unsettled),
})

const FleetAnswer = Type.Object({
  sites: Type.Array(
    Type.Object({ site: Type.String(), replay: Type.String(), window: ScoreSheet.properties.window }),
    { description: 'whose newest finished replays the list is made of; their windows may differ' },
  ),
  unscored: Type.Array(Type.Object({ site: Type.String(), reason: Type.String() })),
  worklist: Type.Array(
    Type.Intersect([Type.Object({ site: Type.String(), replay: Type.String() }), WorklistEntry]),
  ),
  unsettled: Type.Array(Type.Intersect([Type.Object({ site: Type.String() }), Unsettled])),
})

/** Who to climb first: at one site, and over all. */
export function worklistRoutes(app: TypedServer, parts: WorklistRouteParts): void {
  siteRoute(app, parts)
  fleetRoute(app, parts)
}

function siteRoute(app: TypedServer, { latest, setup }: WorklistRouteParts): void {
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
            content: { 'application/json': { schema: SiteAnswer }, ...TEXTS },
          },
          ...NOT_MODIFIED,
          ...problemResponses(CODES),
        },
      },
    },
    async (request, reply) => {
      const type = acceptedType(request, TYPES)
      const answer = await answerOf(request.params.site, latest, setup)
      reply.header('vary', 'accept')
      if (type === 'text/csv')
        return sendCsv(request, reply, worklistRows(answer.worklist), ['rank', 'turbine'])
      return type === 'text/plain'
        ? sendTagged(request, reply, workOrder(answer), 'text/plain; charset=utf-8')
        : sendTagged(request, reply, JSON.stringify(answer))
    },
  )
}

function fleetRoute(app: TypedServer, { latest, setup }: WorklistRouteParts): void {
  app.get(
    '/v1/worklist',
    {
      schema: {
        operationId: 'fleetWorklist',
        tags: ['answers'],
        summary: 'Who to climb first, over all sites',
        description:
          'From the newest finished replay of each site that was set up. Ranked by what the first year brings net of the visit where sites have a price in one currency, else by energy; faulty sensors last. `text/plain`: the ranking, then the work order of each site.',
        headers: IfNoneMatch,
        response: {
          200: {
            description: 'The worklist, first rank first',
            headers: ETAG,
            content: { 'application/json': { schema: FleetAnswer }, ...TEXTS },
          },
          ...NOT_MODIFIED,
          ...problemResponses(FLEET_CODES),
        },
      },
    },
    async (request, reply) => {
      const type = acceptedType(request, TYPES)
      const { answers, unscored } = await answersOfAll(latest, setup)
      reply.header('vary', 'accept')
      if (type === 'text/plain') {
        return sendTagged(request, reply, fleetOrder(answers, unscored), 'text/plain; charset=utf-8')
      }
      const ranked = rankedOverSites(answers)
      if (type === 'text/csv') {
        const rows = worklistRows(ranked.map(({ entry }) => entry)).map(({ rank = null, ...row }, i) => ({
          rank,
          site: ranked[i]!.order.site,
          ...row,
        }))
        return sendCsv(request, reply, rows, ['rank', 'site', 'turbine'])
      }
      const answer = {
        sites: answers.map(({ site, replay, window }) => ({ site, replay, window })),
        unscored,
        worklist: ranked.map(({ order, entry }) => ({ site: order.site, replay: order.replay, ...entry })),
        unsettled: answers.flatMap(({ site, unsettled }) => unsettled.map((one) => ({ site, ...one }))),
      }
      return sendTagged(request, reply, JSON.stringify(answer))
    },
  )
}

async function answersOfAll(latest: LatestSheets, setup: Setup) {
  const answers: Awaited<ReturnType<typeof answerOf>>[] = []
  const unscored: { site: string; reason: string }[] = []
  let after: string | undefined
  do {
    const page = await setup.listSites({ limit: SITES_A_PAGE, ...(after === undefined ? {} : { after }) })
    for (const site of page.sites) {
      try {
        answers.push(await answerOf(site, latest, setup))
      } catch (error) {
        // A site may also be removed between the two questions.
        if (!(error instanceof InputError && ['REPLAY_NOT_FOUND', 'SITE_NOT_FOUND'].includes(error.code)))
          throw error
        unscored.push({ site, reason: 'no finished replay' })
      }
    }
    after = page.next ?? undefined
  } while (after !== undefined)
  return { answers, unscored }
}

async function answerOf(site: string, latest: LatestSheets, setup: Setup) {
  const sheet = await latest.ofSite(site)
  const { replay, window, worklist } = sheet
  // A log that was posted by itself may name a site that was never set up.
  const file = await setup.getSite(site).catch((error: unknown) => {
    if (error instanceof InputError && error.code === 'SITE_NOT_FOUND') return {}
    throw error
  })
  return { replay, site, window, worklist, unsettled: unsettledTurbines(sheet, file) }
}

function sendCsv(
  request: FastifyRequest,
  reply: FastifyReply,
  rows: readonly TableRow[],
  columns: readonly string[],
): FastifyReply {
  return sendTagged(request, reply, toCsv(rows, columns), 'text/csv; charset=utf-8')
}
