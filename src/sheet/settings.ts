import { Type, type Static } from 'typebox'
import { Nullable } from './common.ts'

/** What the estimation can be told: printed in every sheet, so that it can be made again. */
export const ScoringSettings = Type.Object(
  {
    exponent: Type.Number({
      minimum: 0.5,
      maximum: 6,
      description: 'p: power below rated follows the power curve at u cos(g)^(p/3)',
    }),
    exponentLow: Type.Number({
      minimum: 0.5,
      maximum: 6,
      description:
        'lowest value that the true exponent may have (field values of 1.4 to 3 are reported); as `exponent` where that is known',
    }),
    exponentHigh: Type.Number({
      minimum: 0.5,
      maximum: 6,
      description: 'highest value that the true exponent may have; as `exponent` where that is known',
    }),
    actionThresholdDeg: Type.Number({
      minimum: 0.1,
      maximum: 45,
      description: 'standing misalignment from which someone should act',
    }),
    resamples: Type.Integer({
      minimum: 200,
      maximum: 100000,
      description: 'resamples of the day bootstrap, for each block length',
    }),
    seed: Type.Integer({ minimum: 0, maximum: 4294967295, description: 'seed of the day weights' }),
    assumedResponsePctPerDeg: Nullable(
      'response of the anemometer to the vane, % per degree, taken as known; null: unknown',
      { minimum: -5, maximum: 5 },
    ),
    responseSpreadPctPerDeg: Type.Number({
      minimum: 0,
      maximum: 2,
      description: 'standard deviation of the unknown response of the anemometer to the vane, % per degree',
    }),
    windMinMs: Type.Number({
      minimum: 2,
      maximum: 12,
      description: 'lowest wind speed of the rows used for the static offset, m/s',
    }),
    vaneMaxDeg: Type.Number({
      minimum: 5,
      maximum: 60,
      description: 'largest |vane - median vane| of the rows used for the static offset',
    }),
    yawMoveMaxDeg: Type.Number({
      minimum: 0.5,
      maximum: 90,
      description: 'a yaw of more inside one interval sets the row aside',
    }),
    fastDirectionDeg: Type.Number({
      minimum: 1,
      maximum: 180,
      description: 'a change of direction against the row before of more sets the row aside',
    }),
    fastSpeedMs: Type.Number({
      minimum: 0.1,
      maximum: 30,
      description: 'a change of wind speed against the row before of more sets the row aside, m/s',
    }),
    minimumRows: Type.Integer({
      minimum: 20,
      maximum: 100000,
      description: 'fewest rows a static offset is estimated from',
    }),
    minimumDays: Type.Integer({
      minimum: 2,
      maximum: 400,
      description: 'fewest days with used rows a static offset is estimated from',
    }),
  },
  { additionalProperties: false, description: 'Settings in force' },
)
export type ScoringSettings = Static<typeof ScoringSettings>

/** Settings that contradict each other, in words; null = none. */
export function crossedSettings(
  settings: Pick<ScoringSettings, 'exponentLow' | 'exponentHigh'>,
): string | null {
  const { exponentLow, exponentHigh } = settings
  return exponentLow <= exponentHigh
    ? null
    : `exponentLow: expected at most exponentHigh (${exponentHigh}), got ${exponentLow}`
}
