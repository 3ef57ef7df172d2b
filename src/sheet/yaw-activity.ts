import { Type, type Static } from 'typebox'
import { Nullable } from './common.ts'

/** What the yaw drive and its controller did. */
export const YawActivity = Type.Object({
  source: Type.Union([Type.Literal('high-rate'), Type.Literal('intervals'), Type.Literal('none')], {
    description:
      'high-rate: from rows of seconds; intervals: from means, where moves within a row or back and forth are not seen; none: no nacelle position',
  }),
  lowerBounds: Type.Boolean({ description: 'true: moves, travel and share of time are at least these' }),
  daysCovered: Nullable('days with readings of the position'),
  moves: Type.Integer({ minimum: 0 }),
  movesPerDay: Nullable('per day covered'),
  movesPerMonth: Nullable('per 30.44 days covered: wear, for comparison across the fleet'),
  travelDegPerDay: Nullable('degrees turned, either way'),
  travelDegPerMonth: Nullable('per 30.44 days covered: wear, for comparison across the fleet'),
  shareOfTimeYawing: Nullable('0 to 1; from moves alone'),
  medianDurationS: Nullable('of a move'),
  medianTravelDeg: Nullable('of a move'),
  medianRateDegS: Nullable('of moves of 3 degrees and more'),
  slowMovesShare: Nullable('share of these with less than 0.6 times the median rate'),
  clockwiseMovesShare: Nullable('positive: the reading rises'),
  clockwiseRateDegS: Nullable('median rate of moves in which the reading rises'),
  counterClockwiseRateDegS: Nullable('median rate of moves in which it falls'),
  startThresholdDeg: Nullable('yaw error by the vane, mean of a minute, at which moves begin: median'),
  stopPointDeg: Nullable(
    'yaw error by the vane just after a move, positive = stopped short, negative = overshot: median',
  ),
  delayS: Nullable(
    'from when the vane, mean of half a minute, was past half of that threshold for good to the start: median',
  ),
  huntingShare: Nullable('share of moves that are turned back within three minutes'),
  byWindSpeed: Type.Array(
    Type.Object({
      windFromMs: Type.Number(),
      windToMs: Type.Number(),
      rows: Type.Integer({ minimum: 0 }),
      vaneMeanDeg: Nullable('mean vane while running'),
      vaneSdDeg: Nullable('its spread between rows'),
      impliedSdDeg: Nullable(
        'spread of an error that is even between minus and plus the threshold: threshold over root 3',
      ),
    }),
  ),
  bySector: Type.Array(
    Type.Object({
      fromDeg: Type.Number(),
      toDeg: Type.Number(),
      rows: Type.Integer({ minimum: 0 }),
      vaneMeanDeg: Nullable('mean vane while running, by nacelle plus vane as read'),
    }),
  ),
  cableTwist: Type.Object({
    rangeTurns: Nullable(
      'largest less smallest position over 360, of a wound scale; else unwrapped, where high-rate rows allow it',
    ),
    untwistRuns: Type.Integer({ minimum: 0, description: 'moves of more than 300 degrees' }),
    limitTurns: Nullable('from the site file'),
  }),
  note: Type.String(),
})
export type YawActivity = Static<typeof YawActivity>
