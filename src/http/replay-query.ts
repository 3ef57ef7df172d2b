import { Type, type Static } from 'typebox'
import { InputError } from '../errors.ts'
import { checkShape } from '../setup/index.ts'
import { ReadingOptions, ScoringSettings } from '../sheet/index.ts'

const reading = ReadingOptions.properties
const [responseRange] = ScoringSettings.properties.assumedResponsePctPerDeg.anyOf as unknown as [
  { minimum: number; maximum: number },
]

/** How a posted log is to be read, as a query says it; the same for every route that takes logs. */
export const ReadingQuery = {
  timezone: reading.timezone,
  stamp: reading.stamp,
  columns: Type.Optional(
    Type.String({
      description:
        'JSON object: canonical channel -> column of the log, or {"column": ..., "unit": ...}; named columns win over recognised ones',
      examples: ['{"wind_speed":"Wspd","power":{"column":"P","unit":"W"}}'],
    }),
  ),
  turbine: reading.turbine,
  startDate: reading.startDate,
  dateOrder: reading.dateOrder,
  name: Type.Optional(
    Type.String({
      minLength: 1,
      maxLength: 200,
      description: 'name of a log that is the whole body; default: what Content-Disposition says',
    }),
  ),
  dryRun: Type.Optional(
    Type.Boolean({
      default: false,
      description: 'say how the log would be read, from its beginning, and do nothing else',
    }),
  ),
}

export const LogQuery = Type.Object(ReadingQuery, { additionalProperties: false })
export type LogQuery = Static<typeof LogQuery>

/** What the query of POST /v1/replays may hold. What it does not hold comes from the settings of the service. */
export const ReplayQuery = Type.Object(
  {
    ...ReadingQuery,
    ratedPowerKw: Type.Optional(
      Type.Number({
        exclusiveMinimum: 0,
        maximum: 50000,
        description: 'rated power of turbines whose site file gives none, kW',
      }),
    ),
    ...Type.Partial(Type.Omit(ScoringSettings, ['assumedResponsePctPerDeg'])).properties,
    assumeResponse: Type.Optional(
      Type.Number({
        minimum: responseRange.minimum,
        maximum: responseRange.maximum,
        description:
          'response of the nacelle anemometer to the vane, % per degree, taken as known. Unknown by default: a lone turbine then has a wide interval',
      }),
    ),
  },
  { additionalProperties: false },
)
export type ReplayQuery = Static<typeof ReplayQuery>

export interface ReplayOptions {
  readonly reading: ReadingOptions
  readonly settings: ScoringSettings
  readonly ratedPowerKw?: number
}

/**
 * @param query  as checked against LogQuery.
 * @throws InputError BAD_OPTION
 */
export function readingOptions(query: LogQuery): ReadingOptions {
  const { timezone, stamp, columns, turbine, startDate, dateOrder } = query
  const given = { timezone, stamp, turbine, startDate, dateOrder, columns: parseColumns(columns) }
  const present = Object.fromEntries(Object.entries(given).filter(([, value]) => value !== undefined))
  return checkShape(ReadingOptions, present, { code: 'BAD_OPTION', place: '' })
}

/**
 * @param query     as checked against ReplayQuery.
 * @param defaults  the settings of the service.
 * @throws InputError BAD_OPTION
 */
export function replayOptions(query: ReplayQuery, defaults: ScoringSettings): ReplayOptions {
  const { ratedPowerKw, assumeResponse } = query
  const scoring = Object.entries(query).filter(([name]) => name in ScoringSettings.properties)
  return {
    reading: readingOptions(query),
    settings: {
      ...defaults,
      ...(Object.fromEntries(scoring) as Partial<ScoringSettings>),
      ...(assumeResponse === undefined ? {} : { assumedResponsePctPerDeg: assumeResponse }),
    },
    ...(ratedPowerKw === undefined ? {} : { ratedPowerKw }),
  }
}

function parseColumns(json: string | undefined): unknown {
  if (json === undefined) return undefined
  try {
    return JSON.parse(json) as unknown
  } catch (cause) {
    throw new InputError(
      'BAD_OPTION',
      `columns: expected a JSON object, got ${JSON.stringify(json.slice(0, 80))}`,
      { cause },
    )
  }
}
