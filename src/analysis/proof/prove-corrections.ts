import { wrap180 } from '../../kernel/angle/index.ts'
import type { DayWeights } from '../../kernel/stats/index.ts'
import type { CorrectionProof, ScoringSettings, SiteFile } from '../../sheet/index.ts'
import type { HeadingRecord, HeadingStep } from '../changes/offset-changes-heading.ts'
import type { TurbineResponse } from '../neighbours/anemometer-response.ts'
import type { FarmRows } from '../neighbours/neighbours.ts'
import { correctionText } from './correction-text.ts'
import { headingAfterCorrection, type HeadingAnswer } from './heading-after-correction.ts'
import { expectedGain, judgeCorrection, type Ends, type Measured } from './judge-correction.ts'
import type { Sides } from './judged-step.ts'
import { powerAfterCorrection, type PowerAnswer } from './power-after-correction.ts'
import { proofFarm, type ProofFarm, type ProofQuestion } from './proof-farm.ts'
import { standingEachSide, type StandingEachSide } from './standing-each-side.ts'

const DAY_MS = 86_400_000
/** Left out on either side: somebody works at the turbine, and clocks of people differ from clocks of loggers. */
const GAP_MS = 3 * 3_600_000
/** A step of the heading so near to a correction is taken to be the correction. */
const SAME_STEP_MS = 2 * DAY_MS
/** A like step of the heading within this time makes the date doubtful. */
const OTHER_DATE_MS = 21 * DAY_MS
/** Smaller steps of a neighbour's heading leave it unchanged, degrees. */
const NEIGHBOUR_STEP_DEG = 2
/** Shorter sides are tried, days each, where too many neighbours were changed themselves in the whole time. */
const SHORTER_DAYS = [45, 20, 10] as const
/** Share of the other turbines that should be unchanged. */
const UNCHANGED_SHARE = 0.5

export interface ProveQuestion {
  readonly farm: FarmRows
  readonly days: number
  readonly dayWeights: readonly DayWeights[]
  readonly settings: ScoringSettings
  readonly corrections: NonNullable<SiteFile['corrections']>
  readonly events: NonNullable<SiteFile['events']>
  /** Steps of each turbine's heading, in the order of the farm; null: none to be had. */
  readonly headings: readonly (HeadingRecord | null)[]
  /** What neighbours tell of each anemometer; null: nothing. */
  readonly responses: readonly (TurbineResponse | null)[]
  /** Turbines whose signs forbid an offset. */
  readonly blocked: readonly boolean[]
}

/**
 * Holds each correction inside the rows against what came after it: did it take hold, where does the rotor stand on each
 * side, what did power do against unchanged neighbours. In the order of time; corrections of other turbines, and those that
 * lie outside the rows, are left out.
 */
export function proveCorrections(question: ProveQuestion): CorrectionProof[] {
  const { farm, corrections } = question
  const index = new Map(farm.turbines.map(({ turbine }, i) => [turbine, i]))
  const inside = corrections
    .filter(({ turbine, at }) => {
      const atMs = Date.parse(at)
      return index.has(turbine) && atMs > farm.fromMs && atMs < farm.toMs
    })
    .sort((a, b) => Date.parse(a.at) - Date.parse(b.at) || (a.turbine < b.turbine ? -1 : 1))
  if (inside.length === 0) return []
  const prepared = proofFarm(farm, question.blocked)
  return inside.map((correction) => {
    const target = index.get(correction.turbine)!
    return proveOne(question, prepared, correction, target)
  })
}

function proveOne(
  question: ProveQuestion,
  prepared: ProofFarm,
  correction: ProveQuestion['corrections'][number],
  target: number,
): CorrectionProof {
  const { farm, settings } = question
  const atMs = Date.parse(correction.at)
  const { enteredDeg } = correction
  const { sides, neighbours } = comparable(question, target, atMs)
  const one: ProofQuestion = { target, atMs, enteredDeg, neighbours, sides }
  const none = correction.enteredDeg === 0 || !(sides.afterToMs > sides.afterFromMs)
  const { answer, vaneLoggedSeen } = none
    ? { answer: null, vaneLoggedSeen: null }
    : headingAfterCorrection(prepared, one)
  const power = none ? null : powerAfterCorrection(prepared, one)
  const standing = standingEachSide(farm.turbines[target]!, sides, {
    settings,
    dayWeights: question.dayWeights,
    days: question.days,
    response: question.responses[target] ?? null,
  })
  const change = changeOf(standing)
  const before = beforeDeg(standing, answer)
  const spanDays = (fromMs: number, toMs: number): number => Math.max(0, (toMs - fromMs) / DAY_MS)
  const judgement = judgeCorrection({
    enteredDeg,
    headingDeg: answer ? { value: answer.step.step, half: answer.step.halfWidth } : null,
    daysBefore: spanDays(sides.beforeFromMs, atMs),
    daysAfter: spanDays(atMs, sides.afterToMs),
    power: power ? measuredOrNull(power.step.step, power.step.halfWidth) : null,
    beforeDeg: before,
    changeDeg: change,
    exponent: settings.exponent,
  })
  const predicted = expectedGain({ beforeDeg: before, exponent: settings.exponent }, enteredDeg)
  const pct = (step: number): number | null =>
    power && !Number.isNaN(step) ? known(power.pctOf(step)) : known(100 * (Math.exp(3 * step) - 1))
  const pctInterval = (step: number, half: number): [number | null, number | null] =>
    Number.isNaN(half) ? [null, null] : [pct(step - half), pct(step + half)]
  const numbers = {
    outcome: judgement.outcome,
    furtherDays: known(judgement.furtherDays),
    heading: {
      seenIn: answer?.seenIn ?? null,
      expectedDeg: answer ? enteredDeg : null,
      stepDeg: known(answer?.step.step ?? NaN),
      interval95Deg: around(answer?.step.step ?? NaN, answer?.step.halfWidth ?? NaN),
      daysBefore: answer?.step.daysBefore ?? 0,
      daysAfter: answer?.step.daysAfter ?? 0,
    },
    gainPct: power ? pct(power.step.step) : null,
    interval95Pct: power ? pctInterval(power.step.step, power.step.halfWidth) : [null, null],
    predictedPct: predicted ? pct(predicted.value) : null,
    predictedInterval95Pct: predicted ? [pct(predicted.low), pct(predicted.high)] : [null, null],
  }
  return {
    turbine: correction.turbine,
    at: iso(atMs),
    enteredDeg,
    note: correction.note ?? null,
    ...numbers,
    ...correctionText({
      ...numbers,
      enteredDeg,
      code: judgement.code,
      standing: { before: standing.before.deg, after: standing.after.deg },
      like:
        judgement.outcome === 'not taken hold' ? likeStep(question.headings[target], atMs, enteredDeg) : null,
    }),
    window: {
      beforeFrom: iso(sides.beforeFromMs),
      beforeTo: iso(sides.beforeToMs),
      afterFrom: iso(sides.afterFromMs),
      afterTo: iso(Math.max(sides.afterFromMs, sides.afterToMs)),
    },
    vaneLoggedSeen,
    standing: {
      beforeDeg: known(standing.before.deg),
      beforeInterval95Deg: standing.before.interval95Deg.map(known),
      afterDeg: known(standing.after.deg),
      afterInterval95Deg: standing.after.interval95Deg.map(known),
      changeDeg: change ? change.value : null,
      changeInterval95Deg: change ? around(change.value, change.half) : [null, null],
    },
    power: {
      neighbours: neighbours.map((j) => farm.turbines[j]!.turbine),
      rowsBefore: power?.step.rowsBefore ?? 0,
      rowsAfter: power?.step.rowsAfter ?? 0,
      daysBefore: power?.step.daysBefore ?? 0,
      daysAfter: power?.step.daysAfter ?? 0,
      bySector: (power?.bySector ?? []).map(({ step, ...part }) => ({ ...part, gainPct: pct(step) })),
      byWindSpeed: (power?.byWindSpeed ?? []).map(({ step, ...part }) => ({ ...part, gainPct: pct(step) })),
    },
    placebos: placebosOf(power, farm, pct),
  }
}

/** The two sides, up to the next thing that was done or happened to the turbine, and the turbines unchanged throughout. */
function comparable(
  question: ProveQuestion,
  target: number,
  atMs: number,
): { sides: Sides; neighbours: number[] } {
  const { farm } = question
  const moments = farm.turbines.map((_, i) => momentsOf(question, i))
  const own = moments[target]!.filter((ms) => Math.abs(ms - atMs) > 0).filter(
    (ms) => !isSameStep(question.headings[target], ms, atMs),
  )
  const from = Math.max(farm.fromMs, ...own.filter((ms) => ms < atMs).map((ms) => ms + GAP_MS))
  const to = Math.min(farm.toMs, ...own.filter((ms) => ms > atMs).map((ms) => ms - GAP_MS))
  const within = (days: number): Sides => ({
    beforeFromMs: Math.max(from, atMs - days * DAY_MS),
    beforeToMs: atMs - GAP_MS,
    afterFromMs: atMs + GAP_MS,
    afterToMs: Math.min(to, atMs + days * DAY_MS),
  })
  let best: { sides: Sides; neighbours: number[] } | null = null
  for (const days of [Infinity, ...SHORTER_DAYS]) {
    const sides = within(days)
    const neighbours = [...farm.turbines.keys()].filter(
      (j) => j !== target && !moments[j]!.some((ms) => ms > sides.beforeFromMs && ms < sides.afterToMs),
    )
    if (!best || neighbours.length > best.neighbours.length) best = { sides, neighbours }
    if (best.neighbours.length >= UNCHANGED_SHARE * (farm.turbines.length - 1)) break
  }
  return best!
}

/** Everything that was done to a turbine or seen at its heading, epoch ms. */
function momentsOf({ farm, corrections, events, headings }: ProveQuestion, i: number): number[] {
  const { turbine } = farm.turbines[i]!
  return [
    ...corrections.filter((one) => one.turbine === turbine).map(({ at }) => Date.parse(at)),
    ...events
      .filter((one) => one.turbine === undefined || one.turbine === turbine)
      .map(({ at }) => Date.parse(at)),
    ...(headings[i]?.steps ?? [])
      .filter(({ sizeDeg }) => Math.abs(sizeDeg) >= NEIGHBOUR_STEP_DEG)
      .map((step) => step.atMs),
  ]
}

function isSameStep(heading: HeadingRecord | null | undefined, ms: number, atMs: number): boolean {
  return Math.abs(ms - atMs) <= SAME_STEP_MS && (heading?.steps ?? []).some((step) => step.atMs === ms)
}

/** A step of the heading about as large as what was entered, at another date than the one given. */
function likeStep(
  heading: HeadingRecord | null | undefined,
  atMs: number,
  enteredDeg: number,
): HeadingStep | null {
  return (
    (heading?.steps ?? []).find(
      (step) =>
        Math.abs(step.atMs - atMs) > SAME_STEP_MS &&
        Math.abs(step.atMs - atMs) <= OTHER_DATE_MS &&
        Math.abs(wrap180(step.sizeDeg - enteredDeg)) <=
          Math.max(step.halfWidthDeg, 0.25 * Math.abs(enteredDeg)),
    ) ?? null
  )
}

function changeOf({ before, after }: StandingEachSide): Measured | null {
  return measuredOrNull(
    wrap180(after.deg - before.deg),
    Math.hypot(before.ownHalfWidthDeg, after.ownHalfWidthDeg),
  )
}

/**
 * m before, at the exponent in force: from the rows before, and where the heading tells how far the rotor was turned, from
 * those after as well.
 */
function beforeDeg({ before, after }: StandingEachSide, heading: HeadingAnswer | null): Ends | null {
  const own = measuredOrNull(before.deg, before.ownHalfWidthDeg)
  const later = heading
    ? measuredOrNull(
        wrap180(after.deg + heading.step.step),
        Math.hypot(after.ownHalfWidthDeg, heading.step.halfWidth),
      )
    : null
  const one = own && later ? weighted(own, later) : (own ?? later)
  if (!one) return null
  // Response and dilution err alike on both sides: that part stays as wide as it was.
  const half = Math.hypot(one.half, own ? before.sharedHalfWidthDeg : after.sharedHalfWidthDeg)
  return { value: one.value, low: one.value - half, high: one.value + half }
}

/** Mean of two angles, weighted by what each tells. */
function weighted(first: Measured, second: Measured): Measured {
  const [a, b] = [1 / first.half ** 2, 1 / second.half ** 2]
  const value = first.value + (b / (a + b)) * wrap180(second.value - first.value)
  return { value, half: 1 / Math.sqrt(a + b) }
}

function placebosOf(
  power: PowerAnswer | null,
  farm: FarmRows,
  pct: (step: number) => number | null,
): CorrectionProof['placebos'] {
  if (!power) return { spreadPct: null, beyondChance: 0, list: [] }
  const { placebos, halfWidth, spread } = power.step
  return {
    spreadPct: pct(spread),
    beyondChance: placebos.filter(({ step }) => Math.abs(step) > halfWidth).length,
    list: placebos.map(({ turbine, atMs, step }) => ({
      turbine: farm.turbines[turbine]!.turbine,
      at: iso(atMs),
      gainPct: pct(step) ?? 0,
    })),
  }
}

function measuredOrNull(value: number, half: number): Measured | null {
  return Number.isNaN(value) || Number.isNaN(half) ? null : { value, half }
}

function around(centre: number, half: number): [number | null, number | null] {
  return Number.isNaN(centre) || Number.isNaN(half) ? [null, null] : [centre - half, centre + half]
}

function known(value: number): number | null {
  return Number.isFinite(value) ? value : null
}

function iso(ms: number): string {
  return new Date(ms).toISOString()
}
