import { Type, type Static } from 'typebox'
import { InputError } from '../errors.ts'
import { checkShape } from '../setup/index.ts'
import { ReadingOptions, ScoringSettings } from '../sheet/index.ts'

const reading = ReadingOptions.properties

/** What the query of POST /v1/replays may hold. What it does not hold comes from the settings of the service. */
export const ReplayQuery = Type.Object(
  {
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
        minimum: -5,
        maximum: 5,
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
 * @param query     as checked against ReplayQuery.
 * @param defaults  the settings of the service.
 * @throws InputError BAD_OPTION
 */
export function replayOptions(query: ReplayQuery, defaults: ScoringSettings): ReplayOptions {
  const { timezone, stamp, columns, turbine, startDate, ratedPowerKw, assumeResponse, ...scoring } = query
  const given = Object.entries({ timezone, stamp, turbine, startDate, columns: parseColumns(columns) })
  const present = Object.fromEntries(given.filter(([, value]) => value !== undefined))
  return {
    reading: checkShape(ReadingOptions, present, { code: 'BAD_OPTION', place: '' }),
    settings: {
      ...defaults,
      ...scoring,
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
      {
        cause,
      },
    )
  }
}
