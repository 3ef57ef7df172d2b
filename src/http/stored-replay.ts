import { Type } from 'typebox'
import type { StoredRequest } from '../replay/contract.ts'
import { checkShape } from '../setup/index.ts'
import { IsoTime, ScoringSettings } from '../sheet/index.ts'
import { Name, timeMs } from './answers.ts'

/** What POST /v1/replays takes as JSON: a window of logs that were posted to a site before. */
export const StoredReplay = Type.Object(
  {
    site: Name('a site whose logs are stored'),
    from: IsoTime('first moment of the window'),
    to: IsoTime('first moment after the window'),
    turbines: Type.Optional(
      Type.Array(Name('name of a turbine'), {
        minItems: 1,
        maxItems: 5000,
        description: 'default: all that have rows in the window',
      }),
    ),
    options: Type.Optional(
      Type.Object(
        {
          ...Type.Partial(ScoringSettings).properties,
          ratedPowerKw: Type.Optional(
            Type.Number({
              exclusiveMinimum: 0,
              maximum: 50000,
              description: 'rated power of turbines whose set-up gives none, kW',
            }),
          ),
        },
        { additionalProperties: false, description: 'settings that differ from those of the service' },
      ),
    ),
  },
  { additionalProperties: false, description: 'Replay of stored logs' },
)

/** @throws InputError BAD_REQUEST, BAD_OPTION */
export function storedRequest(body: unknown, defaults: ScoringSettings): StoredRequest {
  const given = checkShape(StoredReplay, body, { code: 'BAD_REQUEST', place: '' })
  const { ratedPowerKw, ...settings } = given.options ?? {}
  return {
    site: given.site,
    fromMs: timeMs(given.from, 'from'),
    toMs: timeMs(given.to, 'to'),
    ...(given.turbines === undefined ? {} : { turbines: given.turbines }),
    settings: { ...defaults, ...settings },
    ...(ratedPowerKw === undefined ? {} : { ratedPowerKw }),
  }
}
