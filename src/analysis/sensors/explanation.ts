import type { FindingKind, SensorFinding, TurbineSheet } from '../../sheet/index.ts'
import type { SameWay } from './same-way.ts'

/** What an attribution is drawn from. */
export type AttributedSheet = Pick<
  TurbineSheet,
  'turbine' | 'model' | 'verdict' | 'reason' | 'staticOffset' | 'sensors'
>

/** One thing that may lie behind the findings. */
export interface Explanation {
  /** The higher, the earlier it is told. */
  readonly weight: number
  readonly text: string
  readonly evidence: readonly string[]
  readonly wouldSettle: readonly string[]
  /** Findings that it accounts for. */
  readonly findings: readonly SensorFinding[]
}

export interface RuleInput {
  readonly sheet: AttributedSheet
  /** All turbines of the model stand off the same way; null: they do not. */
  readonly sameWay: SameWay | null
}

/** Says what it sees, or null. */
export type Rule = (input: RuleInput) => Explanation | null

export const WORK_OF_THAT_DAY = 'At the desk: work orders, alarms and parameter changes of that day.'
/** Two things on the same day, allowing for how well either is dated. */
const SAME_DAY_MS = 36 * 3_600_000

/** An explanation that leans on findings and their own checks. */
export function explain(
  weight: number,
  text: string,
  findings: readonly SensorFinding[],
  first: readonly string[] = [],
): Explanation {
  return {
    weight,
    text,
    evidence: findings.map(said),
    wouldSettle: [...first, ...findings.map(({ checkFirst }) => checkFirst)],
    findings,
  }
}

/** A finding as evidence. */
export function said({ sensor, finding, howSure }: SensorFinding): string {
  return `${sensor.replace('-', ' ')}: ${finding} (${howSure})`
}

/** Findings of some kinds, at whatever sensor but the clock. */
export function ofKinds(sheet: AttributedSheet, kinds: readonly FindingKind[]): SensorFinding[] {
  return pick(sheet, ({ kind, sensor }) => kinds.includes(kind) && sensor !== 'clock')
}

/** Findings that are wanted. */
export function pick(sheet: AttributedSheet, wanted: (finding: SensorFinding) => boolean): SensorFinding[] {
  return sheet.sensors.filter(wanted)
}

/** When some findings were: one by its edges, several by their number and the first and last edge. */
export function spells(findings: readonly SensorFinding[]): string {
  const froms = findings.flatMap(({ from }) => (from === null ? [] : [from])).sort()
  const tos = findings.flatMap(({ to }) => (to === null ? [] : [to])).sort()
  const [first] = froms
  const last = tos.at(-1)
  if (first === undefined || last === undefined)
    return findings.length === 1 ? '' : `${findings.length} times`
  const when = `${minute(first)} to ${minute(last)}`
  return findings.length === 1
    ? `from ${when}`
    : `${findings.length} times between ${when.replace(' to ', ' and ')}`
}

/** Within a day and a half of each other. */
export function near(edge: string | null, at: string): boolean {
  return edge !== null && Math.abs(Date.parse(edge) - Date.parse(at)) <= SAME_DAY_MS
}

/** Both lasted at the same time. */
export function overlap(a: SensorFinding, b: SensorFinding): boolean {
  if (a.from === null || a.to === null || b.from === null || b.to === null) return false
  return a.from < b.to && b.from < a.to
}

/** Of the interval of the standing misalignment, degrees; Infinity where there is none. */
export function halfWidth(sheet: AttributedSheet): number {
  const [low = null, high = null] = sheet.staticOffset.standingInterval95Deg
  return low === null || high === null ? Infinity : (high - low) / 2
}

/** A time as it is told. */
export function minute(iso: string): string {
  return `${iso.slice(0, 16).replace('T', ' ')} UTC`
}

/** Degrees with their sign. */
export function signed(value: number): string {
  const text = value.toFixed(1)
  if (Number(text) === 0) return text.replace('-', '')
  return value > 0 ? `+${text}` : text
}
