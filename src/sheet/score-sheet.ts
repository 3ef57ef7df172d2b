import { Type, type Static } from 'typebox'
import { Interval, IsoTime, Nullable, NullableIsoTime } from './common.ts'
import { EnergyLoss } from './energy-loss.ts'
import { CorrectionProof } from './correction.ts'
import { Attribution, SensorFinding, SensorTest } from './findings.ts'
import {
  CaptureMatrix,
  Entry,
  FittedExponent,
  OffsetByCondition,
  PowerAgainstVane,
} from './offset-conditions.ts'
import { FarmNorthTie, NacelleNorth } from './nacelle.ts'
import { Receipt } from './receipt.ts'
import { ScoringSettings } from './settings.ts'
import { Outlook, WorklistEntry } from './worklist.ts'
import { YawActivity } from './yaw-activity.ts'

/** Why a row is not used for the static offset, in the order the reasons are tested. A row has one reason or none. */
export const SET_ASIDE_REASONS = [
  'missing-channel',
  'averaged-across-north',
  'incomplete-interval',
  'excluded',
  'not-running',
  'transition',
  'limited',
  'sensor-fault',
  'fast-change',
  'outside-wind-range',
  'vane-out-of-range',
  'before-change',
] as const
export type SetAsideReason = (typeof SET_ASIDE_REASONS)[number]

const Count = Type.Integer({ minimum: 0 })

const SetAside = Type.Object({
  reason: Type.Unsafe<SetAsideReason>({ type: 'string', enum: [...SET_ASIDE_REASONS] }),
  rows: Count,
})

/** A departure from a response that is one number. */
const Departure = (description: string) =>
  Type.Object(
    {
      size: Nullable('null: not tested'),
      interval95: Interval('of it'),
      beyondChance: Type.Union([Type.Boolean(), Type.Null()]),
    },
    { description },
  )

const VaneStatistics = Type.Object({
  meanDeg: Nullable('circular mean, [-180, 180)'),
  medianDeg: Nullable('circular median, [-180, 180)'),
  circularSdDeg: Nullable('sqrt(-2 ln R)'),
  resultantLength: Nullable('R, 0 to 1'),
  rows: Count,
})

const YawErrorGroup = Type.Object({
  from: Nullable('lower edge, inclusive'),
  to: Nullable('upper edge, exclusive'),
  rows: Count,
  meanDeg: Nullable('circular mean'),
  circularSdDeg: Nullable('circular SD'),
})

const YawError = Type.Object({
  meanDeg: Nullable('circular mean of v + d, [-180, 180)'),
  medianDeg: Nullable('circular median'),
  circularSdDeg: Nullable('dynamic yaw error: sqrt(-2 ln R)'),
  resultantLength: Nullable('R, 0 to 1'),
  kappa: Nullable('von Mises concentration, maximum likelihood'),
  skewness: Nullable('circular skewness'),
  kurtosis: Nullable('circular kurtosis'),
  meanInterval95Deg: Interval('of the mean given d, from the spread between days'),
  quantilesDeg: Type.Object({
    p05: Nullable('5 %'),
    p25: Nullable('25 %'),
    p50: Nullable('50 %'),
    p75: Nullable('75 %'),
    p95: Nullable('95 %'),
  }),
  histogram: Type.Object({
    binWidthDeg: Type.Number(),
    firstEdgeDeg: Type.Number(),
    counts: Type.Array(Count),
  }),
  byWindSpeed: Type.Array(YawErrorGroup),
  byDirection: Type.Array(YawErrorGroup),
  offsetUsedDeg: Nullable('the d that was added to the vane; 0 with a note when it is not known'),
  note: Type.String(),
  rows: Count,
})

const Estimate = Type.Object({
  method: Type.String(),
  estimateDeg: Nullable('d by this method'),
  interval95Deg: Interval('of d by this method'),
  interval95GivenExponentDeg: Interval('the same, were the exponent known'),
  leansOn: Type.String({ description: 'the assumption it stands on' }),
  kind: Type.Union([Type.Literal('slope'), Type.Literal('vertex'), Type.Literal('direct')]),
  rows: Count,
  days: Count,
})

const StaticOffset = Type.Object({
  estimateDeg: Nullable('d: degrees to add to the logged vane to get the yaw error'),
  interval95Deg: Interval('of d, with what is not known of the exponent'),
  interval95GivenExponentDeg: Interval('of d, were the exponent in force known to be the true one'),
  standingMisalignmentDeg: Nullable('m = d + mean vane: what is judged and what is entered'),
  standingInterval95Deg: Interval('of m, with what is not known of the exponent: what the verdict looks at'),
  standingInterval95GivenExponentDeg: Interval('of m, were the exponent in force known to be the true one'),
  intervalParts: Type.Object(
    {
      statistical: Nullable('half-width from the scatter between days, degrees'),
      response: Nullable('half-width from the anemometer response, degrees'),
      exponent: Nullable(
        'how much further an end lies because the exponent is not known, degrees: added to the end, not to the squares, and mostly to the one away from 0',
      ),
      instrument: Nullable('half-width from the reference instrument, degrees'),
      dilution: Nullable('half-width from vane noise that the rotor does not feel, degrees'),
    },
    {
      description:
        'half-widths at 95 % of m; all but the exponent’s combine as root of the sum of squares to the interval with the exponent given',
    },
  ),
  method: Type.Union([Type.String(), Type.Null()]),
  estimates: Type.Array(Estimate),
  byExponent: Type.Array(
    Type.Object({
      exponent: Type.Number(),
      estimateDeg: Nullable('d at this exponent'),
      standingMisalignmentDeg: Nullable('m at this exponent'),
    }),
  ),
  changes: Type.Array(
    Type.Object({
      at: IsoTime('start of the first row with the new offset'),
      from: IsoTime('earliest moment at 95 %'),
      to: IsoTime('latest moment at 95 %'),
      fromDeg: Nullable('d before'),
      toDeg: Nullable('d after'),
      sizeDeg: Nullable('change of d'),
      sizeInterval95Deg: Interval('of the size'),
      seenIn: Type.Union(
        [Type.Literal('both'), Type.Literal('power'), Type.Literal('heading'), Type.Literal('event')],
        {
          description: 'both: heading against the farm and power; event: given in the site file',
        },
      ),
    }),
    { description: 'the estimate is that of the rows after the last one' },
  ),
  signChecked: Type.Boolean(),
  vaneLogged: Type.Union([
    Type.Literal('beforeCorrection'),
    Type.Literal('afterCorrection'),
    Type.Literal('unknown'),
  ]),
  furtherDays: Nullable(
    'more days of such data until the verdict could be given; null: days will not settle it, or none are needed',
  ),
  furtherNote: Type.String(),
  rows: Count,
  days: Count,
  bins: Type.Array(
    Type.Object({
      vaneFromDeg: Type.Number(),
      vaneToDeg: Type.Number(),
      rows: Count,
      relativePowerMean: Nullable('power over the measured curve, mean'),
      relativePowerSd: Nullable('the same, standard deviation'),
    }),
  ),
  fittedExponent: FittedExponent,
  byCondition: OffsetByCondition,
  powerAgainstVane: PowerAgainstVane,
  captureMatrix: CaptureMatrix,
  entry: Entry,
})

export const TurbineSheet = Type.Object(
  {
    turbine: Type.String(),
    model: Type.Union([Type.String(), Type.Null()]),
    ratedPowerKw: Nullable('as given or worked out from the log'),
    verdict: Type.Union([
      Type.Literal('offset'),
      Type.Literal('aligned'),
      Type.Literal('undetermined'),
      Type.Literal('blocked'),
    ]),
    reason: Type.String({ description: 'one sentence' }),
    reasonCode: Type.String({ description: 'stable code of the reason' }),
    rows: Type.Object({
      accepted: Count,
      used: Count,
      setAside: Type.Array(SetAside),
      averagedAcrossNorth: Type.Object(
        { vane: Count, nacelle_position: Count, wind_direction: Count },
        {
          description:
            'rows in which the logger averaged this angle arithmetically over the seam of its scale',
        },
      ),
    }),
    score: Nullable('100 x E[cos(g)^3], weighted by available energy; null when undetermined or blocked'),
    scoreAt10min: Type.String({ description: 'what the score does and does not hold' }),
    scoreWithinInterval: Nullable('upper bound of the loss inside the interval, % of energy; needs vane_sd'),
    vane: VaneStatistics,
    yawError: YawError,
    staticOffset: StaticOffset,
    energyLoss: EnergyLoss,
    outlook: Type.Union([Outlook, Type.Null()]),
    powerCurve: Type.Array(
      Type.Object({
        windSpeedMs: Type.Number({ description: 'mean of the bin, normalised to 1.225 kg/m3' }),
        powerKw: Type.Number(),
        rows: Count,
        steepness: Nullable('d ln P / d ln u'),
      }),
    ),
    sensors: Type.Array(SensorFinding),
    sensorTests: Type.Array(SensorTest),
    attribution: Attribution,
    nacelle: NacelleNorth,
    yawActivity: YawActivity,
    advice: Type.Array(Type.String()),
    cautions: Type.Array(Type.String()),
  },
  { description: 'One turbine of a score sheet' },
)
export type TurbineSheet = Static<typeof TurbineSheet>

export const ScoreSheet = Type.Object(
  {
    replay: Type.String(),
    site: Type.Union([Type.String(), Type.Null()]),
    window: Type.Object({
      from: NullableIsoTime('first row'),
      to: NullableIsoTime('end of the last row'),
      intervalS: Nullable('s'),
    }),
    rows: Type.Object({ received: Count, accepted: Count, duplicate: Count, rejected: Count }),
    receipt: Receipt,
    provenance: Type.Object({
      version: Type.String(),
      node: Type.String(),
      settings: ScoringSettings,
      reading: Type.Record(Type.String(), Type.Unknown(), {
        description: 'how the log was read: zone, stamp, columns',
      }),
      inputs: Type.Array(Type.Object({ name: Type.String(), sha256: Type.String(), rows: Count })),
      seed: Type.Integer(),
    }),
    fleet: Type.Object({
      north: Type.Union([FarmNorthTie, Type.Null()], {
        description: 'what ties the consensus direction of the farm to true north; null: nothing does',
      }),
      anemometerResponsePerDeg: Type.Record(
        Type.String(),
        Type.Object({
          estimate: Nullable('relative change per degree'),
          interval95: Interval('of it'),
          spread: Nullable('between turbines'),
          turbines: Count,
          source: Type.String(),
          changeWithSpeed: Departure(
            'by how much the response is larger at 10 m/s than at 6 m/s, relative change per degree',
          ),
          square: Departure(
            'part of the reading that is alike on both sides of the vane, relative change per square degree',
          ),
        }),
      ),
    }),
    turbines: Type.Array(TurbineSheet),
    worklist: Type.Array(WorklistEntry),
    corrections: Type.Array(CorrectionProof),
    warnings: Type.Array(Type.String()),
  },
  { description: 'Score sheet' },
)
export type ScoreSheet = Static<typeof ScoreSheet>

/** What GET /v1/replays/{id} answers. */
export const ReplayState = Type.Union([
  Type.Literal('queued'),
  Type.Literal('running'),
  Type.Literal('done'),
  Type.Literal('failed'),
  Type.Literal('cancelled'),
])
