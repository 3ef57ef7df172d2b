import { Type } from 'typebox'
import { Interval, Nullable } from './common.ts'

const Count = Type.Integer({ minimum: 0 })

const Condition = Type.Union([
  Type.Literal('wind-speed'),
  Type.Literal('day-night'),
  Type.Literal('turbulence'),
  Type.Literal('wake'),
])

/** The offset apart by condition: from power, levels and noise shared with the fit to all rows. */
export const OffsetByCondition = Type.Object({
  groups: Type.Array(
    Type.Object({
      condition: Condition,
      label: Type.String(),
      fromMs: Nullable('of a bin of wind speed, m/s, inclusive'),
      toMs: Nullable('exclusive'),
      rows: Count,
      days: Count,
      estimateDeg: Nullable('d of these rows; null with too few rows or days'),
      standingMisalignmentDeg: Nullable('m of these rows: d and their own mean vane'),
      interval95Deg: Interval(
        'of d, from the scatter between days alone: what moves all groups alike (response, exponent) is not in it',
      ),
    }),
  ),
  sameness: Type.Array(
    Type.Object({
      condition: Condition,
      groups: Count,
      chiSquare: Nullable('Cochran’s Q'),
      degreesOfFreedom: Count,
      pValue: Nullable('chance of differences this large among groups with one offset'),
    }),
  ),
  windSpeedSlope: Type.Union([
    Type.Object({
      slopeDegPerMs: Nullable('change of d per m/s'),
      slopeInterval95DegPerMs: Interval('of it'),
      pValue: Nullable('smaller chance of "all bins alike" and "no slope", times two'),
    }),
    Type.Null(),
  ]),
  curve: Type.Union(
    [
      Type.Array(
        Type.Object({
          windSpeedMs: Type.Number({ description: 'middle of the bin' }),
          standingMisalignmentDeg: Nullable('m: to be added at this wind speed'),
          interval95Deg: Interval('of it, from the scatter between days alone'),
        }),
      ),
      Type.Null(),
    ],
    {
      description:
        'table for the controller, where the offset depends on wind speed (pValue of the slope below 0.01); null: one number will do',
    },
  ),
  note: Type.String(),
})

const grid = {
  speedFromMs: Type.Number({ description: 'lower edge of the first bin of wind speed, m/s' }),
  speedWidthMs: Type.Number(),
  speedBins: Count,
  vaneFromDeg: Type.Number({ description: 'lower edge of the first bin of the vane' }),
  vaneWidthDeg: Type.Number(),
  vaneBins: Count,
  rows: Type.Array(Count, {
    description: 'of speed bin s and vane bin v at [s x vaneBins + v]; so are the other arrays',
  }),
}

export const CaptureMatrix = Type.Object(grid, {
  description: 'how many running rows lie at each wind speed (as read) and vane (never cut)',
})

export const PowerAgainstVane = Type.Object(
  {
    ...grid,
    relativePowerMean: Type.Array(Nullable('power over the measured curve, mean; null where no row lies')),
    relativePowerSd: Type.Array(Nullable('standard deviation; null with fewer than two rows')),
  },
  { description: 'rows that are used for the static offset: what the estimate can be checked against' },
)

export const FittedExponent = Type.Union([
  Type.Object({
    exponent: Nullable('what the bend of power against vane would make'),
    interval95: Interval('of it, from the scatter between days alone'),
    note: Type.String(),
  }),
  Type.Null(),
])

/** What is entered where, in the words of whoever enters it. */
export const Entry = Type.Object({
  addToVaneDeg: Nullable(
    'm, to be added to the vane offset of the controller; null unless the verdict is `offset` and sign and vaneLogged are known',
  ),
  vaneOffsetAfterDeg: Nullable(
    'the vane offset that the controller then holds; null where vane.correctionDeg is not stated',
  ),
  turnMarkDeg: Nullable('the same done at the vane: turn its zero mark so far, clockwise seen from above'),
  text: Type.String({ description: 'how d and m hang together for this kind of logged vane' }),
  vaneGain: Type.Object({
    assumed: Type.Number({ description: 'degrees that the vane reads for one degree of wind' }),
    text: Type.String(),
    ifGain: Type.Array(
      Type.Object({
        gain: Type.Number(),
        standsOffDeg: Nullable('what the rotor then stands off'),
        enterDeg: Nullable('what would then have to be entered'),
      }),
    ),
  }),
})
