import { RAD_PER_DEG } from '../../kernel/angle/index.ts'
import type { CorrectionOutcome } from '../../sheet/index.ts'
import { NORMAL_95 } from '../offset/resampled-spread.ts'

/** Shares of the degrees entered that part "as entered", "in part", "not at all" and "the other way". */
const AS_ENTERED = 0.8
const IN_PART = 0.2
const HALF = 0.5
const STILL = 0.6
const QUARTER = 0.25
/** An alarm from power alone takes this many half-widths at 95 %: 99.7 %. */
const ALARM = 1.5
/** Days after a correction beyond which nobody waits for power. */
const PATIENCE_DAYS = 120
/** Days after which the heading has told, as far as it can. */
const HEADING_DAYS = 2
/** Days after which the offset has been estimated anew, as far as it is worth waiting for. */
const LOOK_AGAIN_DAYS = 14
/** Squared standard deviations by which one account must fit better than the others: 99.5 and 97.5 of 100. */
const SURE = 6.6
const LIKELY = 3.84

/** A number and its half-width at 95 %. */
export interface Measured {
  readonly value: number
  readonly half: number
}

/** A number and the ends of its interval at 95 %. */
export interface Ends {
  readonly value: number
  readonly low: number
  readonly high: number
}

export interface Evidence {
  readonly enteredDeg: number
  /** Step of the heading, clockwise positive; null: no heading to look at. */
  readonly headingDeg: Measured | null
  readonly daysBefore: number
  readonly daysAfter: number
  /** ln of the wind speed that power stands for, after less before; null: no neighbours, or too few rows. */
  readonly power: Measured | null
  /** m before; null: not to be had. */
  readonly beforeDeg: Ends | null
  /** m after less m before, by power against vane; null: not to be had. */
  readonly changeDeg: Measured | null
  readonly exponent: number
}

export interface Judgement {
  readonly outcome: CorrectionOutcome
  /** Why, in a stable word. */
  readonly code:
    | 'heading-other-way'
    | 'heading-still'
    | 'heading-in-part'
    | 'further-off'
    | 'power-lower'
    | 'power-higher'
    | 'vane-other-way'
    | 'power-same'
    | 'offset-smaller'
    | 'power-too-fine'
    | 'waiting-for-heading'
    | 'waiting-for-power'
    | 'no-evidence'
  /** More days after the correction; NaN: days will not settle it, or are not needed. */
  readonly furtherDays: number
}

/**
 * Gain, in ln of the wind speed that power stands for, of turning a rotor that stands m off by so many degrees.
 * (p / 3) [ln cos(m - turned) - ln cos(m)]; NaN beyond 90 degrees.
 */
export function gainOfTurning(standingDeg: number, turnedDeg: number, exponent: number): number {
  const cosine = (angle: number): number => Math.cos(angle * RAD_PER_DEG)
  return (exponent / 3) * (Math.log(cosine(standingDeg - turnedDeg)) - Math.log(cosine(standingDeg)))
}

/**
 * What became of a correction. The heading says whether it took hold; power says whether that helped. "Partly" is never
 * said from power alone: a gain of half the size is also what a small misalignment gives.
 */
export function judgeCorrection(evidence: Evidence): Judgement {
  const { headingDeg } = evidence
  if (!headingDeg) return byPowerAlone(evidence)
  const entered = Math.abs(evidence.enteredDeg)
  const turned = headingDeg.value * Math.sign(evidence.enteredDeg)
  const [low, high] = [turned - headingDeg.half, turned + headingDeg.half]
  if (high < -QUARTER * entered) return settled('wrong way', 'heading-other-way')
  if (high >= AS_ENTERED * entered && low > HALF * entered) return heldAsEntered(evidence, headingDeg)
  if (low > IN_PART * entered && high < AS_ENTERED * entered) return settled('partly', 'heading-in-part')
  const isStill = low <= 0 || turned < IN_PART * entered
  if (isStill && high < STILL * entered && low > -STILL * entered) {
    return settled('not taken hold', 'heading-still')
  }
  const enough = Math.max(1, HEADING_DAYS - evidence.daysAfter)
  return { outcome: 'too early', code: 'waiting-for-heading', furtherDays: enough }
}

/** The heading stepped as entered: was that the right way, and does power show it? */
function heldAsEntered(evidence: Evidence, headingDeg: Measured): Judgement {
  const { power, daysAfter } = evidence
  const expected = expectedGain(evidence, headingDeg.value)
  if (power && power.value + ALARM * power.half < 0) return settled('wrong way', 'power-lower')
  const isUp = power !== null && power.value - power.half > 0
  if (expected && expected.high < 0 && !isUp) return settled('wrong way', 'further-off')
  if (isUp) return settled('worked', 'power-higher')
  const speaks = power !== null && expected !== null && power.half < Math.abs(expected.value)
  if (speaks && power.value + power.half < expected.value) return settled('no effect seen', 'power-same')
  // Power allows the gain and cannot show it by itself: the heading, and the offset by power against vane, do.
  if (daysAfter >= LOOK_AGAIN_DAYS && expected && expected.low > 0) return settled('worked', 'offset-smaller')
  return waiting(evidence, expected)
}

/**
 * Without a heading three things may have happened: turned as entered, not turned, turned the other way. Each foretells a
 * gain, by m before, and a change of m; what is seen says how much more likely one is than another.
 */
function byPowerAlone(evidence: Evidence): Judgement {
  const { power, changeDeg, enteredDeg } = evidence
  if (!power && !changeDeg) return { outcome: 'too early', code: 'no-evidence', furtherDays: NaN }
  if (power && power.value + ALARM * power.half < 0) return settled('wrong way', 'power-lower')
  const asEntered = misfit(evidence, enteredDeg)
  const still = misfit(evidence, 0)
  const otherWay = misfit(evidence, -enteredDeg)
  if (Math.min(asEntered, still) - otherWay > SURE) return settled('wrong way', 'vane-other-way')
  const expected = expectedGain(evidence, enteredDeg)
  if (expected && expected.high < 0 && still - asEntered > SURE) return settled('wrong way', 'further-off')
  if (power && power.value - power.half > 0) return settled('worked', 'power-higher')
  if (expected && expected.low > 0 && Math.min(still, otherWay) - asEntered > LIKELY) {
    return settled('worked', 'offset-smaller')
  }
  if (Math.min(asEntered, otherWay) - still > LIKELY) return settled('no effect seen', 'power-same')
  return waiting(evidence, expected)
}

/** Squared standard deviations between what is seen and what turning by so many degrees foretells. */
function misfit(evidence: Evidence, turnedDeg: number): number {
  const { power, changeDeg } = evidence
  const expected = expectedGain(evidence, turnedDeg)
  let sum = 0
  if (power && expected) {
    const half = Math.hypot(power.half, (expected.high - expected.low) / 2)
    sum += ((power.value - expected.value) / (half / NORMAL_95)) ** 2
  }
  if (changeDeg) sum += ((changeDeg.value + turnedDeg) / (changeDeg.half / NORMAL_95)) ** 2
  return sum
}

function settled(outcome: CorrectionOutcome, code: Judgement['code']): Judgement {
  return { outcome, code, furtherDays: NaN }
}

/** Too early, with the days until power could tell the expected gain from none. */
function waiting(evidence: Evidence, expected: Ends | null): Judgement {
  const { power, daysAfter, daysBefore } = evidence
  const days =
    power && expected ? daysUntil(power.half, Math.abs(expected.value), { daysBefore, daysAfter }) : NaN
  const lookAgain = LOOK_AGAIN_DAYS - daysAfter
  if (evidence.headingDeg && lookAgain > 0) {
    const sooner = days > 0 ? Math.min(days, lookAgain) : lookAgain
    return { outcome: 'too early', code: 'waiting-for-power', furtherDays: Math.max(1, Math.ceil(sooner)) }
  }
  if (days + daysAfter <= PATIENCE_DAYS) {
    return { outcome: 'too early', code: 'waiting-for-power', furtherDays: Math.max(1, Math.ceil(days)) }
  }
  if (lookAgain > 0) {
    return { outcome: 'too early', code: 'waiting-for-power', furtherDays: Math.ceil(lookAgain) }
  }
  return { outcome: 'too early', code: power ? 'power-too-fine' : 'no-evidence', furtherDays: NaN }
}

/** Half-width falls with 1 / days before + 1 / days after. */
function daysUntil(
  half: number,
  wanted: number,
  { daysBefore, daysAfter }: { daysBefore: number; daysAfter: number },
): number {
  if (!(daysBefore > 0 && daysAfter > 0 && wanted > 0)) return NaN
  const now = 1 / daysBefore + 1 / daysAfter
  const inverse = now * (wanted / half) ** 2 - 1 / daysBefore
  return inverse > 0 ? Math.max(0, 1 / inverse - daysAfter) : Infinity
}

/** Gain of turning by so many degrees, over the interval of m before. */
export function expectedGain(
  { beforeDeg, exponent }: Pick<Evidence, 'beforeDeg' | 'exponent'>,
  turnedDeg: number,
): Ends | null {
  if (!beforeDeg) return null
  const at = (deg: number): number => gainOfTurning(deg, turnedDeg, exponent)
  const ends = [at(beforeDeg.low), at(beforeDeg.high)]
  return { value: at(beforeDeg.value), low: Math.min(...ends), high: Math.max(...ends) }
}
