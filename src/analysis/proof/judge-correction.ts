import { RAD_PER_DEG } from '../../kernel/angle/index.ts'
import type { CorrectionOutcome } from '../../sheet/index.ts'

/** Shares of the degrees entered that part "as entered", "in part", "not at all" and "the other way". */
const AS_ENTERED = 0.8
const IN_PART = 0.2
const HALF = 0.5
const QUARTER = 0.25
/** An alarm from power alone takes this many half-widths at 95 %: 99.7 %. */
const ALARM = 1.5
/** Days after a correction beyond which nobody waits for power. */
const PATIENCE_DAYS = 120
/** Days after which the heading has told, as far as it can. */
const HEADING_DAYS = 2

/** A number and its half-width at 95 %. */
export interface Measured {
  readonly value: number
  readonly half: number
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
  readonly beforeDeg: Measured | null
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
  if (high < HALF * entered && low > -HALF * entered) return settled('not taken hold', 'heading-still')
  const enough = Math.max(1, HEADING_DAYS - evidence.daysAfter)
  return { outcome: 'too early', code: 'waiting-for-heading', furtherDays: enough }
}

/** The heading stepped as entered: was that the right way, and does power show it? */
function heldAsEntered(evidence: Evidence, headingDeg: Measured): Judgement {
  const { power } = evidence
  const expected = expectedGain(evidence, headingDeg.value)
  if (power && power.value + ALARM * power.half < 0) return settled('wrong way', 'power-lower')
  const isUp = power !== null && power.value - power.half > 0
  if (expected && expected.high < 0 && !isUp) return settled('wrong way', 'further-off')
  if (isUp) return settled('worked', 'power-higher')
  if (!power || !expected) return waiting(evidence, expected)
  const speaks = power.half < Math.abs(expected.value)
  if (speaks && power.value + power.half < expected.value) return settled('no effect seen', 'power-same')
  if (speaks && expected.low > 0) return settled('worked', 'power-higher')
  return waiting(evidence, expected)
}

function byPowerAlone(evidence: Evidence): Judgement {
  const { power, changeDeg, enteredDeg } = evidence
  const expected = expectedGain(evidence, enteredDeg)
  if (power && power.value + ALARM * power.half < 0) return settled('wrong way', 'power-lower')
  if (changeDeg) {
    const turned = -changeDeg.value * Math.sign(enteredDeg)
    if (turned + ALARM * changeDeg.half < -QUARTER * Math.abs(enteredDeg)) {
      return settled('wrong way', 'vane-other-way')
    }
  }
  if (power && power.value - power.half > 0) return settled('worked', 'power-higher')
  if (!power && !changeDeg) return { outcome: 'too early', code: 'no-evidence', furtherDays: NaN }
  const speaks = power !== null && expected !== null && power.half < Math.abs(expected.value)
  if (speaks && power.value + power.half < expected.value) return settled('no effect seen', 'power-same')
  return waiting(evidence, expected)
}

function settled(outcome: CorrectionOutcome, code: Judgement['code']): Judgement {
  return { outcome, code, furtherDays: NaN }
}

/** Too early, with the days until power could tell the expected gain from none; where it never will, the heading decides. */
function waiting(evidence: Evidence, expected: Expected | null): Judgement {
  const { power, daysAfter, daysBefore } = evidence
  const days =
    power && expected ? daysUntil(power.half, Math.abs(expected.value), { daysBefore, daysAfter }) : NaN
  if (days + daysAfter <= PATIENCE_DAYS) {
    return { outcome: 'too early', code: 'waiting-for-power', furtherDays: Math.max(1, Math.ceil(days)) }
  }
  if (evidence.headingDeg && expected && expected.low > 0) return settled('worked', 'power-too-fine')
  const isYoung = daysAfter < HEADING_DAYS * 5
  return {
    outcome: 'too early',
    code: power ? 'power-too-fine' : 'no-evidence',
    furtherDays: isYoung ? 10 : NaN,
  }
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

interface Expected {
  readonly value: number
  readonly low: number
  readonly high: number
}

/** Gain of turning by so many degrees, over the interval of m before. */
export function expectedGain(
  { beforeDeg, exponent }: Pick<Evidence, 'beforeDeg' | 'exponent'>,
  turnedDeg: number,
): Expected | null {
  if (!beforeDeg) return null
  const at = (deg: number): number => gainOfTurning(deg, turnedDeg, exponent)
  const ends = [at(beforeDeg.value - beforeDeg.half), at(beforeDeg.value + beforeDeg.half)]
  return { value: at(beforeDeg.value), low: Math.min(...ends), high: Math.max(...ends) }
}
