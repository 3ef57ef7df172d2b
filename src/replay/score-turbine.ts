import {
  anemometerYawResponse,
  energyLoss,
  lastSegment,
  nacelleFindings,
  nacelleNorth,
  nacelleTests,
  powerCurveTable,
  preferReference,
  preferYawMoves,
  readiness,
  referenceOffset,
  score,
  staticOffset,
  vaneHighRate,
  vaneStatistics,
  OWN_ANEMOMETER,
  verdictOf,
  yawActivity,
  yawError,
  yawFindings,
  yawTests,
  type Block,
  type DayWeights,
  type FarmEstimate,
  type HighRateRecord,
  type Prices,
  type NacelleRecord,
  type SignCheck,
  type StaticOffsetAnswer,
  type TurbineEvent,
  type TurbineResponse,
  type Verdict,
} from '../analysis/index.ts'
import { correctSpeed, countReasons, reasonsSince, rowsSince, type TurbineFrame } from '../frame/index.ts'
import { SET_ASIDE_REASONS, type LongTerm, type ScoringSettings, type TurbineSheet } from '../sheet/index.ts'
import { adviceFor } from './advice.ts'
import { CAUTIONS, curveCaution } from './cautions.ts'
import { entryOf } from './entry.ts'

/** Everything that scoring one turbine needs; plain data, so that it can travel to a worker thread. */
export interface ScoreTask {
  readonly frame: TurbineFrame
  readonly settings: ScoringSettings
  readonly dayWeights: readonly DayWeights[]
  readonly days: number
  /** What neighbours tell of this anemometer; null = nothing. */
  readonly response: TurbineResponse | null
  readonly farmEstimates: readonly FarmEstimate[]
  /** Per row of the frame: 1 = free stream, 0 = in or beside a wake; null = not known. */
  readonly freeStream: Uint8Array | null
  readonly sign: SignCheck
  /** What the farm says of this turbine's nacelle position. */
  readonly nacelle: NacelleRecord
  /** What was done to this turbine, from the site file. */
  readonly events: readonly TurbineEvent[]
  /** What the wind of a year is judged by, from the site file. */
  readonly longTerm: LongTerm | undefined
  /** What energy is worth; null = no money is shown. */
  readonly prices: Prices | null
  /** Findings that need the whole farm, such as a clock that is off. */
  readonly farmFindings: TurbineSheet['sensors']
  /** What the high-rate rows behind the intervals told; null = the log holds none. */
  readonly highRate: HighRateRecord | null
  /** Which tests of sensors ran before the turbines were scored. */
  readonly farmTests: readonly TurbineSheet['sensorTests'][number][]
}

/** Runs the questions about one turbine, in order, and writes its part of the sheet. NaN stands for missing. */
export function scoreTurbine(task: ScoreTask): TurbineSheet {
  const { settings, sign } = task
  const notReady = readiness(task.frame)
  const yawResponse = anemometerYawResponse(task.frame, task.response)
  const byTheSecond = vaneHighRate(task.frame, task.highRate?.days ?? null)
  const block = notReady ?? sign.block
  const segment = lastSegment(task.frame, {
    days: task.days,
    usedDays: countDays(task.frame),
    exponent: settings.exponent,
    heading: task.nacelle.heading,
    events: task.events,
  })
  const yawDays = (task.highRate?.days ?? []).flatMap(({ yaw: day }) => (day ? [day] : []))
  const yaw = yawActivity(task.frame, yawDays)
  // From here on the sheet speaks of the rows since the last change.
  const since = rowsSince(task.frame, segment.fromMs)
  const freeStream = task.freeStream?.subarray(task.frame.time.length - since.time.length) ?? null
  const byPower = staticOffset(since, { ...task, freeStream }, block)
  const answer = block
    ? byPower
    : preferReference(
        preferYawMoves(byPower, task.highRate, { ...task, hasNeighbours: task.response !== null }),
        referenceOffset(byPower.frame, task.dayWeights),
        settings,
      )
  const { frame, standing } = answer
  const whole = correctSpeed(task.frame, answer.responsePerDeg, settings.vaneMaxDeg)
  const counts = countReasons(reasonsSince(whole, segment.fromMs))
  const verdict = judge(block, answer, settings)
  const shown = { ...answer.sheet, changes: segment.changes, signChecked: sign.checked }
  const correctionDeg = frame.setup.vane?.correctionDeg
  const offset = { ...shown, entry: entryOf(shown, { verdict: verdict.verdict, correctionDeg, standing }) }
  const settled = verdict.verdict === 'offset' || verdict.verdict === 'aligned'
  const scored = settled && standing ? score(frame, standing.offsetDeg) : null
  return {
    turbine: frame.turbine,
    model: frame.setup.model ?? null,
    ratedPowerKw: frame.ratedPowerKw,
    verdict: verdict.verdict,
    reason: verdict.text,
    reasonCode: verdict.code,
    rows: {
      accepted: task.frame.time.length,
      used: counts.used,
      setAside: SET_ASIDE_REASONS.filter((reason) => counts[reason] > 0).map((reason) => ({
        reason,
        rows: counts[reason],
      })),
      averagedAcrossNorth: frame.averagedAcrossNorth,
    },
    score: scored?.score ?? null,
    scoreAt10min: `from means of ${frame.intervalS} s: what the yaw error does inside an interval is not in it`,
    scoreWithinInterval: scored?.withinInterval ?? null,
    vane: vaneStatistics(frame),
    yawError: yawError(frame, offset.estimateDeg),
    staticOffset: offset,
    energyLoss: energyLoss(frame, {
      exponent: settings.exponent,
      offset: standing,
      byExponent: answer.byExponent,
      longTerm: task.longTerm,
      prices: task.prices,
    }),
    outlook: null, // the farm tells it
    powerCurve: powerCurveTable(frame),
    sensors: [
      ...(notReady ? [notReady.finding] : []),
      ...sign.findings,
      ...nacelleFindings(task.frame, task.nacelle, segment),
      ...yawFindings(task.frame, yaw, yawDays),
      ...task.farmFindings,
      ...yawResponse.findings,
      ...byTheSecond.findings,
    ],
    sensorTests: [
      ...nacelleTests(task.nacelle),
      ...yawTests(yaw),
      ...task.farmTests,
      ...yawResponse.tests,
      ...byTheSecond.tests,
    ],
    attribution: { text: '', evidence: [], wouldSettle: [] },
    nacelle: nacelleNorth(task.nacelle, offset, yawDays),
    yawActivity: yaw,
    advice: adviceFor(verdict, offset),
    cautions: [...curveCaution(offset), ...CAUTIONS],
  }
}

/** Days with rows that are used for the offset. */
function countDays(frame: TurbineFrame): number {
  return new Set(frame.day.filter((_, i) => frame.reason[i] === 0)).size
}

function judge(block: Block | null, answer: StaticOffsetAnswer, settings: ScoringSettings): Verdict {
  if (block) return { verdict: 'blocked', code: block.code, text: block.text }
  if (answer.disagreement !== null) {
    return { verdict: 'undetermined', code: 'estimates-disagree', text: answer.disagreement }
  }
  if (answer.standing && isResponseOpen(answer, settings)) {
    const [low, high] = answer.standing.standingInterval95Deg
    return {
      verdict: 'undetermined',
      code: 'response-not-known',
      text:
        `the response of the anemometer to the vane is not known, and 0.1 % per degree of it moves m by 3.3 degrees: ` +
        `${answer.standing.standingDeg.toFixed(1)} degrees (95 %: ${low.toFixed(1)} to ${high.toFixed(1)}) rests on a range of responses; ` +
        'neighbours, a reference instrument, a month at 1 Hz, or a known response would settle it',
    }
  }
  if (answer.standing) {
    return verdictOf(
      answer.standing.standingDeg,
      answer.standing.standingInterval95Deg,
      settings.actionThresholdDeg,
      {
        exponent: settings.exponent,
        interval95Deg: answer.standing.standingInterval95GivenExponentDeg,
      },
    )
  }
  const failure = answer.failure ?? { code: 'no-fit', text: 'no estimate' }
  return { verdict: 'undetermined', code: failure.code, text: failure.text }
}

/**
 * Whether the estimate in front takes the anemometer's response from the range of a setting. Farms have been seen at the end of any such
 * range, all turbines alike: there an interval says how far m may be off, and is no ground for a climb.
 */
function isResponseOpen({ sheet }: StaticOffsetAnswer, settings: ScoringSettings): boolean {
  return settings.assumedResponsePctPerDeg === null && sheet.method === OWN_ANEMOMETER
}
