import { Type } from 'typebox'
import type { Replays } from '../replay/contract.ts'
import type { Setup } from '../setup/index.ts'
import { Trend } from '../sheet/index.ts'
import { flatRow, toCsv } from '../sheet/tables.ts'
import { acceptedType } from './accept.ts'
import { ETAG, IfNoneMatch, NOT_MODIFIED, sendTagged, SERVICE_CODES, SiteParams } from './answers.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

/** A year of months, and as many again for windows that were scored twice. */
const USUAL_REPLAYS = 24

type Table = 'points' | 'lines' | 'fleet' | 'fleetLines'

/** Months compared. */
export function trendRoute(app: TypedServer, { replays, setup }: { replays: Replays; setup: Setup }): void {
  app.get(
    '/v1/sites/:site/trend',
    {
      schema: {
        operationId: 'trend',
        tags: ['answers'],
        summary: 'Months compared',
        description:
          'Misalignment, loss, dynamic yaw error and yaw wear over the windows of the newest finished replays, for each turbine and for the fleet, with straight lines through them: a change counts where its interval leaves 0 out. Of windows that overlap, the replay made last counts. `new` is what the newest replay says that the one before it did not.',
        params: SiteParams,
        querystring: Type.Object(
          {
            replays: Type.Optional(
              Type.Integer({
                minimum: 1,
                maximum: 200,
                default: USUAL_REPLAYS,
                description: 'newest finished replays that are read, at most',
              }),
            ),
            table: Type.Optional(
              Type.Union(
                (['points', 'lines', 'fleet', 'fleetLines'] as const).map((name) => Type.Literal(name)),
                { description: 'which table CSV gives; default points: one row a turbine and window' },
              ),
            ),
          },
          { additionalProperties: false },
        ),
        headers: IfNoneMatch,
        response: {
          200: {
            description: 'The trend',
            headers: ETAG,
            content: {
              'application/json': { schema: Trend },
              'text/csv': { schema: { type: 'string' } },
            },
          },
          ...NOT_MODIFIED,
          ...problemResponses(['BAD_OPTION', 'SITE_NOT_FOUND', 'NOT_ACCEPTABLE', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const type = acceptedType(request, ['application/json', 'text/csv'])
      const { site } = request.params
      const { replays: most = USUAL_REPLAYS, table = 'points' } = request.query as {
        replays?: number
        table?: Table
      }
      const trend = await replays.trend(site, { replays: most })
      // A log that was posted by itself may name a site that was never set up.
      if (trend.turbines.length === 0) await setup.getSite(site)
      reply.header('vary', 'accept')
      return type === 'text/csv'
        ? sendTagged(request, reply, csvOf(trend, table), 'text/csv; charset=utf-8')
        : sendTagged(request, reply, JSON.stringify(trend))
    },
  )
}

function csvOf({ turbines, fleet }: Trend, table: Table): string {
  const rows: Record<Table, () => object[]> = {
    points: () =>
      turbines.flatMap(({ turbine, points }) =>
        points.map(({ standingInterval95Deg: [low, high], yawActivity, ...point }) => ({
          turbine,
          ...point,
          standingLowerDeg: low ?? null,
          standingUpperDeg: high ?? null,
          ...yawActivity,
        })),
      ),
    lines: () =>
      turbines.flatMap(({ turbine, lines }) => lines.map((line) => ({ turbine, ...lineRow(line) }))),
    fleet: () => fleet.points.map(({ yawActivity, ...point }) => ({ ...point, ...yawActivity })),
    fleetLines: () => fleet.lines.map(lineRow),
  }
  const made = rows[table]()
  // A number that one window has and another has not is an empty field there.
  const names = [...new Set(made.flatMap((row) => Object.keys(row)))]
  const blank = Object.fromEntries(names.map((name) => [name, null]))
  return toCsv(
    made.map((row) => flatRow({ ...blank, ...row })),
    [table],
  )
}

function lineRow({
  interval95: [low, high],
  lastChange95: [lastLow, lastHigh],
  ...line
}: Trend['fleet']['lines'][number]) {
  return {
    ...line,
    perYearLower: low ?? null,
    perYearUpper: high ?? null,
    lastChangeLower: lastLow ?? null,
    lastChangeUpper: lastHigh ?? null,
  }
}
