export type { DayWeights } from '../kernel/stats/index.ts'
export { dayBlocks } from './offset/day-blocks.ts'
export { energyLoss, type EnergyLossRequest } from './energy/energy-loss.ts'
export { pricesOver, type Prices } from './energy/prices.ts'
export { powerCurveTable } from './energy/power-curve-table.ts'
export { readiness, type Block } from './sensors/readiness.ts'
export { score, type Score } from './energy/score.ts'
export {
  OWN_ANEMOMETER,
  SHOWN_EXPONENTS,
  staticOffset,
  type StaticOffsetAnswer,
} from './offset/static-offset.ts'
export { vaneStatistics } from './vane-statistics.ts'
export { verdictOf, type Verdict } from './offset/verdict.ts'
export { yawError } from './yaw-error.ts'
export { clockLags, clockLagsOf, type ClockLag } from './sensors/clock-lag.ts'
export { missingPulses } from './sensors/missing-pulses.ts'
export { signChecks, type SignCheck } from './sensors/sign-check.ts'
export { compareNeighbours, type FarmRows, type Neighbours } from './neighbours/neighbours.ts'
export type { FarmResponse, TurbineResponse } from './neighbours/anemometer-response.ts'
export type { ResponseShape } from './neighbours/response-shape.ts'
export { disagree, type FarmEstimate } from './neighbours/farm-estimates.ts'
export { preferReference } from './offset/prefer-reference.ts'
export { preferYawMoves } from './offset/prefer-yaw-moves.ts'
export { referenceOffset, type ReferenceOffset } from './offset/reference-offset.ts'
export { lastSegment, type LastSegment, type TurbineEvent } from './changes/last-segment.ts'
export { headingSteps, type HeadingRecord } from './changes/offset-changes-heading.ts'
export {
  buffersOf,
  DAY_MARGIN_MS,
  DAY_MS,
  HIGH_RATE_CHANNELS,
  highRateRows,
  type HighRateRows,
} from './high-rate/high-rate-rows.ts'
export { examineDay, type HighRateDay, type HighRateRecord } from './high-rate/examine-day.ts'
export { anemometerYawResponse } from './sensors/anemometer-yaw-response.ts'
export { vaneHighRate } from './sensors/vane-high-rate.ts'
export { vaneAndAnemometer } from './sensors/vane-and-anemometer.ts'
export { joinReports, type SensorReport } from './sensors/sensor-report.ts'
export { proveCorrections, type ProveQuestion } from './proof/prove-corrections.ts'
export { nacelleRecords, type FarmNorth, type NacelleRecord } from './sensors/nacelle-records.ts'
export { nacelleFindings } from './sensors/nacelle-findings.ts'
export { nacelleNorth, nacelleTests, withTrueNorth, type TrueNorth } from './sensors/nacelle-north.ts'
export { trendLine, type TrendValue } from './proof/trend-line.ts'
export { attributions } from './sensors/attribution.ts'
export { costAt, probabilityBeyond, shrunkOffsets, type ShrunkOffsets } from './energy/shrunk-offsets.ts'
export { northByWakes, type WakeNorth } from './sensors/north-wakes.ts'
export { surveyedNorth } from './sensors/north-surveyed.ts'
export { yawDay, type YawDay } from './yaw-activity/yaw-day.ts'
export { yawActivity } from './yaw-activity/yaw-activity.ts'
export { yawFindings, yawTests } from './yaw-activity/yaw-findings.ts'
export { vaneIdleBias } from './sensors/vane-idle-bias.ts'
