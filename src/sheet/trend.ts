import { Type, type Static } from 'typebox'
import { CorrectionProof } from './correction.ts'
import { Interval, IsoTime, Nullable } from './common.ts'
import { TurbineSheet } from './score-sheet.ts'

const Count = Type.Integer({ minimum: 0 })
const Verdict = TurbineSheet.properties.verdict

/** A straight line through one number of several windows. */
export const TrendLine = Type.Object({
  quantity: Type.String({
    description: 'name of the number, as in the points; yawActivity.* as the sheet names it',
  }),
  windows: Count,
  perYear: Nullable('slope, in units of the number a year'),
  interval95: Interval('of the slope'),
  beyondChance: Type.Boolean({ description: 'whether the interval leaves 0 out' }),
  lastChange: Nullable('last window less the one before'),
  lastChange95: Interval('of it: combined error of the two; null where a window has none'),
  lastBeyondChance: Type.Boolean(),
})
export type TrendLine = Static<typeof TrendLine>

export const TrendPoint = Type.Object({
  replay: Type.String(),
  from: IsoTime('start of the window'),
  to: IsoTime('end of the window'),
  verdict: Verdict,
  standingDeg: Nullable('m'),
  standingInterval95Deg: Interval('of m, as the sheet gives it'),
  comparableHalfWidthDeg: Nullable(
    'half-width of m without what errs alike in every window (exponent, dilution)',
  ),
  staticPct: Nullable('recoverable by a correction, % of produced energy'),
  staticAnnualMwh: Nullable('of a year'),
  dynamicSdDeg: Nullable('circular SD of the yaw error'),
  dynamicPct: Nullable('lost to the spread of the yaw error, % of produced energy'),
  score: Nullable('as in the sheet'),
  yawActivity: Type.Record(Type.String(), Type.Number(), {
    description: 'numbers of the sheet’s yaw activity: wear of the yaw drive',
  }),
})
export type TrendPoint = Static<typeof TrendPoint>

export const FleetPoint = Type.Object({
  replay: Type.String(),
  from: IsoTime('start of the window'),
  to: IsoTime('end of the window'),
  turbines: Count,
  offset: Count,
  aligned: Count,
  undetermined: Count,
  blocked: Count,
  meanStandingDeg: Nullable('mean m of turbines with an estimate: moves when a farm changes as one'),
  meanStandingHalfWidthDeg: Nullable('at 95 %, turbines taken as independent'),
  meanAbsStandingDeg: Nullable('mean |m|'),
  staticAnnualMwh: Nullable('sum over turbines with a verdict of offset or aligned'),
  dynamicSdDeg: Nullable('mean over turbines'),
  yawActivity: Type.Record(Type.String(), Type.Number(), { description: 'means over turbines' }),
})
export type FleetPoint = Static<typeof FleetPoint>

/** What a sheet says that the one before it did not. */
export const WhatIsNew = Type.Object({
  replay: Type.String(),
  since: Type.Union([Type.String(), Type.Null()], {
    description: 'the replay before it; null: this is the first of the site',
  }),
  verdicts: Type.Array(
    Type.Object({
      turbine: Type.String(),
      from: Type.Union([Verdict, Type.Null()], { description: 'null: it was not in the sheet before' }),
      to: Verdict,
      reason: Type.String(),
    }),
  ),
  findings: Type.Array(
    Type.Object({
      turbine: Type.String(),
      sensor: Type.String(),
      kind: Type.String(),
      finding: Type.String(),
      severity: Type.String(),
    }),
    { description: 'findings of a kind that the turbine did not have' },
  ),
  gone: Type.Array(Type.Object({ turbine: Type.String(), sensor: Type.String(), kind: Type.String() }), {
    description: 'findings that are no longer there',
  }),
  moved: Type.Array(
    Type.Object({
      turbine: Type.String(),
      fromDeg: Type.Number(),
      toDeg: Type.Number(),
      changeDeg: Type.Number(),
      interval95Deg: Interval('of the change'),
    }),
    { description: 'misalignments that moved by more than the combined error' },
  ),
  corrections: Type.Array(
    Type.Object({
      turbine: Type.String(),
      at: IsoTime('when it was entered'),
      from: Type.Union([CorrectionProof.properties.outcome, Type.Null()]),
      to: CorrectionProof.properties.outcome,
    }),
    { description: 'corrections whose outcome is another, or that are judged for the first time' },
  ),
  missing: Type.Array(Type.String(), {
    description: 'turbines of the sheet before that this one does not hold',
  }),
})
export type WhatIsNew = Static<typeof WhatIsNew>

export const Trend = Type.Object(
  {
    site: Type.String(),
    turbines: Type.Array(
      Type.Object({
        turbine: Type.String(),
        points: Type.Array(TrendPoint),
        lines: Type.Array(TrendLine),
      }),
    ),
    fleet: Type.Object({ points: Type.Array(FleetPoint), lines: Type.Array(TrendLine) }),
    new: Type.Union([WhatIsNew, Type.Null()], {
      description: 'of the newest replay; null when there is none',
    }),
  },
  { description: 'Months compared' },
)
export type Trend = Static<typeof Trend>
