import { circularMean, circularMedian, wrap180 } from '../kernel/angle/index.ts'
import { robustSd } from '../kernel/stats/index.ts'

/**
 * A reading must stand this far from what the rows around it say, degrees, and this many times the turbine's usual unrest.
 * Twice the scatter of the rows around is added.
 */
const CONTRADICTION_DEG = 15
const UNREST_TIMES = 6
/** The same where the interval's own extremes show that it crossed the seam, or another channel contradicts. */
const CONTRADICTION_WITH_EVIDENCE_DEG = 10
/** What the rows around say must lie this near to the seam: half of a large yaw move. */
const REACH_DEG = 50
/** Rows looked at on either side; the wider reach where the nearer rows scatter. */
const ROWS_EACH_SIDE = [3, 9] as const
/** A turbine that hunts about the seam spoils several rows on end: those found are left out, and the rest judged again. */
const PASSES = 4
/** Rows around that scatter more than this say nothing, degrees. */
const SCATTER_MAX_DEG = 20
/** An arithmetic SD this near to that of readings on both sides of the seam proves them, relative. */
const SD_MATCH = 0.15
/** A vane beyond this while producing, on a scale whose seam lies dead ahead, was averaged over the seam, degrees. */
const PRODUCING_VANE_DEG = 45
/** More such rows than this among those that produce: the logger takes arithmetic means. */
const ARITHMETIC_SHARE = 0.05
/** Readings on both sides of the seam cannot have so small an SD, unless the mean is right to a degree; degrees. */
const SD_ACQUITS_DEG = 15
/** A step of more is a jump from one end of a scale to the other, degrees. */
const JUMP_DEG = 270
/** Share of readings that must lie on a scale for it to be that scale: sentinels may remain. */
const SCALE_SHARE = 0.999

export const ACROSS_NORTH_CHANNELS = ['vane', 'nacelle_position', 'wind_direction'] as const
export type AcrossNorthChannel = (typeof ACROSS_NORTH_CHANNELS)[number]

/** One angle as it was logged, with the statistics of its interval where there are some; degrees, length n. */
export interface LoggedAngle {
  readonly mean: Float64Array
  readonly sd?: Float64Array | undefined
  readonly min?: Float64Array | undefined
  readonly max?: Float64Array | undefined
}

export interface AcrossNorthInput {
  readonly time: Float64Array
  readonly intervalMs: number
  readonly power: Float64Array
  /** In the frame's convention, degrees, [-180, 180). */
  readonly vane: Float64Array
  /** The vane as it was logged; undefined when it was worked out from other channels. */
  readonly loggedVane?: LoggedAngle | undefined
  /** What the logged vane reads when the rotor faces the wind, degrees. */
  readonly vaneCentreDeg: 0 | 180
  readonly nacellePosition?: LoggedAngle | undefined
  readonly windDirection?: LoggedAngle | undefined
}

/** Which readings were averaged across the seam of their scale. */
export interface AcrossNorth {
  /** 1 = this reading is no direction; length n. */
  readonly flags: Readonly<Record<AcrossNorthChannel, Uint8Array>>
  readonly counts: Readonly<Record<AcrossNorthChannel, number>>
}

/**
 * Finds readings of loggers that take the arithmetic mean of a wrapped angle: 359 and 1 give 180, and anything between.
 *
 * A reading is called so when it contradicts the rows around it, and these say that the angle stood near the seam of its
 * scale: north for 0 to 360, south for -180 to 180; a scale wound over several turns has none. What the rows around say is
 * taken from nacelle plus vane, which a yaw move leaves alone; from the nacelle by itself where there is no vane. Where the
 * log holds them: extremes that do not span the seam acquit, a standard deviation that only readings on both sides of it can
 * have convicts, and so does a wind direction that contradicts nacelle plus vane.
 *
 * Not found: a nacelle that stands on the seam for more rows than it does not, unless extremes or SD are logged.
 */
export function acrossNorth(input: AcrossNorthInput): AcrossNorth {
  const n = input.time.length
  const none = (): Uint8Array => new Uint8Array(n)
  const { vane, loggedVane, nacellePosition, windDirection } = input
  const around = neighbourhood(input.time, input.intervalMs)
  const nacelleAndVane =
    nacellePosition && loggedVane ? nacellePosition.mean.map((position, i) => position + vane[i]!) : undefined
  const flags = { vane: none(), nacelle_position: none(), wind_direction: none() }
  const mismatch =
    nacelleAndVane && windDirection ? mismatchOf(windDirection.mean, nacelleAndVane) : undefined

  const vaneSeam = loggedVane ? seamOf(loggedVane.mean) : NaN
  const vaneAhead = wrap180(vaneSeam - input.vaneCentreDeg) === 0
  if (loggedVane && vaneAhead) flags.vane = findVanesAhead(input, loggedVane, vaneSeam)
  // A vane that is no direction spoils the sum: the nacelle is then judged without it.
  const sum = nacelleAndVane?.map((angle, i) => (flags.vane[i] === 1 ? NaN : angle))
  if (nacellePosition) {
    const seam = seamOf(nacellePosition.mean)
    const alone = nacellePosition.mean.slice()
    const drop = (i: number): void => {
      alone[i] = NaN
      if (sum) sum[i] = NaN
    }
    const expect = (i: number): Expectation => {
      const steady = sum && !Number.isNaN(sum[i]!) ? around(sum, i) : undefined
      if (steady && steady.count > 0) return { ...steady, angleDeg: wrap180(steady.angleDeg - vane[i]!) }
      return around(alone, i)
    }
    flags.nacelle_position = findChannel(
      nacellePosition,
      seam,
      { expect, drop, unrestDeg: unrestOf(sum ?? alone), isSteady: steadyIn(sum ?? alone) },
      (i) =>
        mismatch ? windAgrees(mismatch[i]!, around(windDirection!.mean, i), windDirection!.mean[i]!) : false,
    )
  }
  if (windDirection) {
    const seam = seamOf(windDirection.mean)
    const alone = windDirection.mean.slice()
    flags.wind_direction = findChannel(
      windDirection,
      seam,
      {
        expect: (i) => around(alone, i),
        drop: (i) => (alone[i] = NaN),
        unrestDeg: unrestOf(alone),
        isSteady: steadyIn(alone),
      },
      (i) =>
        mismatch !== undefined &&
        flags.nacelle_position[i] === 0 &&
        windAgrees(mismatch[i]!, around(sum!, i), sum![i]!),
    )
  }
  if (loggedVane && !vaneAhead && !Number.isNaN(vaneSeam) && nacellePosition) {
    flags.vane = findVanesAstern(input, loggedVane, nacellePosition.mean)
  }
  const count = (flag: Uint8Array): number => flag.reduce((total, one) => total + one, 0)
  return {
    flags,
    counts: {
      vane: count(flags.vane),
      nacelle_position: count(flags.nacelle_position),
      wind_direction: count(flags.wind_direction),
    },
  }
}

/** What the rows around say; `count` 0 when they say nothing. */
interface Expectation {
  readonly angleDeg: number
  readonly scatterDeg: number
  readonly count: number
}

type Around = (angles: Float64Array, i: number) => Expectation

/** Circular median of the rows before and after. */
function neighbourhood(time: Float64Array, intervalMs: number): Around {
  return (angles, i) => {
    for (const rows of ROWS_EACH_SIDE) {
      const reachMs = (rows + 0.5) * intervalMs
      const known: number[] = []
      for (let j = Math.max(0, i - rows); j <= i + rows && j < time.length; j++) {
        if (j === i || Math.abs(time[j]! - time[i]!) > reachMs || Number.isNaN(angles[j]!)) continue
        known.push(angles[j]!)
      }
      if (known.length < 2) continue
      const angleDeg = circularMedian(known)
      const off = known.map((angle) => Math.abs(wrap180(angle - angleDeg))).sort((a, b) => a - b)
      const scatterDeg = off[off.length >> 1]!
      if (scatterDeg <= SCATTER_MAX_DEG) return { angleDeg, scatterDeg, count: known.length }
    }
    return { angleDeg: NaN, scatterDeg: NaN, count: 0 }
  }
}

/**
 * Where a scale jumps: 0 for 0 to 360, 180 for -180 to 180, NaN for one that is wound. Readings that never jump from one end
 * to the other within two rows show no seam: a wound scale may lie within one turn for a month.
 */
function seamOf(mean: Float64Array): number {
  let known = 0
  let wrapped = 0
  let signed = 0
  let jumps = 0
  for (let i = 0; i < mean.length; i++) {
    const angle = mean[i]!
    if (Number.isNaN(angle)) continue
    known++
    if (angle >= 0 && angle <= 360) wrapped++
    if (angle >= -180 && angle <= 180) signed++
    if (
      Math.abs(angle - (mean[i - 1] ?? NaN)) > JUMP_DEG ||
      Math.abs(angle - (mean[i - 2] ?? NaN)) > JUMP_DEG
    )
      jumps++
  }
  if (jumps === 0) return NaN
  if (wrapped >= SCALE_SHARE * known) return 0
  return signed >= SCALE_SHARE * known ? 180 : NaN
}

/** How far a row stands from the mean of the rows before and after, as a robust SD, degrees. */
function unrestOf(angles: Float64Array): number {
  return robustSd(
    angles.map((angle, i) => {
      const before = wrap180((angles[i - 1] ?? NaN) - angle)
      const after = wrap180((angles[i + 1] ?? NaN) - angle)
      return (before + after) / 2
    }),
  )
}

function steadyIn(angles: Float64Array): (i: number) => boolean {
  const near = (i: number, j: number): boolean =>
    Math.abs(wrap180(angles[i]! - (angles[j] ?? NaN))) < CONTRADICTION_WITH_EVIDENCE_DEG
  return (i) => near(i, i - 1) && near(i, i + 1)
}

/** What the rows around say of a row, and how to leave a row out of that from now on. */
interface Judge {
  /** Robust SD of a row against the rows before and after, degrees. */
  readonly unrestDeg: number
  /** Whether a row agrees with the rows before and after, so that nothing has to be looked at. */
  readonly isSteady: (i: number) => boolean
  readonly expect: (i: number) => Expectation
  readonly drop: (i: number) => void
}

function findChannel(
  angle: LoggedAngle,
  seam: number,
  judge: Judge,
  isContradicted: (i: number) => boolean,
): Uint8Array {
  const flags = new Uint8Array(angle.mean.length)
  if (Number.isNaN(seam)) return flags
  let open: number[] = []
  for (let i = 0; i < flags.length; i++) {
    // Both sides of the seam, averaged, give something well away from it.
    if (!(Math.abs(wrap180(angle.mean[i]! - seam)) > CONTRADICTION_WITH_EVIDENCE_DEG)) continue
    const crossed = crossing(angle, i, seam)
    if (crossed === 'yes' || crossed === 'proved' || (crossed === 'unknown' && !judge.isSteady(i)))
      open.push(i)
  }
  for (let pass = 0; pass < PASSES; pass++) {
    const found = open.filter((i) => isAveraged(angle, seam, i, judge, isContradicted))
    for (const i of found) {
      flags[i] = 1
      judge.drop(i)
    }
    if (found.length === 0) break
    open = open.filter((i) => flags[i] === 0)
  }
  return flags
}

function isAveraged(
  angle: LoggedAngle,
  seam: number,
  i: number,
  judge: Judge,
  isContradicted: (i: number) => boolean,
): boolean {
  const value = angle.mean[i]!
  const fromSeamDeg = Math.abs(wrap180(value - seam))
  const crossed = crossing(angle, i, seam)
  if (crossed === 'proved') return true
  const expected = judge.expect(i)
  if (expected.count === 0) return crossed === 'yes' && fromSeamDeg > REACH_DEG
  const hasEvidence = crossed === 'yes' || isContradicted(i)
  const least = hasEvidence
    ? CONTRADICTION_WITH_EVIDENCE_DEG
    : Math.max(CONTRADICTION_DEG, UNREST_TIMES * judge.unrestDeg)
  const off = Math.abs(wrap180(value - expected.angleDeg))
  const expectedFromSeam = Math.abs(wrap180(expected.angleDeg - seam))
  return off > least + 2 * expected.scatterDeg && expectedFromSeam < Math.min(REACH_DEG, fromSeamDeg)
}

/**
 * What the statistics of an interval say of the seam: extremes that do not span it acquit, an SD that belongs to readings
 * on both sides proves.
 */
function crossing(angle: LoggedAngle, i: number, seam: number): 'no' | 'unknown' | 'yes' | 'proved' {
  const aboveSeam = (((angle.mean[i]! - seam) % 360) + 360) % 360
  const bothSides = Math.sqrt(aboveSeam * (360 - aboveSeam)) // of readings at 0 and at 360, in the share that gives this mean
  const sd = angle.sd?.[i] ?? NaN
  if (sd > 30 && Math.abs(sd - bothSides) < SD_MATCH * bothSides) return 'proved'
  const span = angle.max && angle.min ? angle.max[i]! - angle.min[i]! : NaN
  if (span >= 0 && span < 180) return 'no'
  return span > 300 ? 'yes' : 'unknown'
}

/** Wind direction less nacelle plus vane, its own constant removed; undefined when they have nothing to do with each other. */
function mismatchOf(windDirection: Float64Array, sum: Float64Array): Float64Array | undefined {
  const difference = windDirection.map((direction, i) => direction - sum[i]!)
  const usual = circularMean(difference)
  if (!(usual.resultant > 0.9)) return undefined
  return difference.map((angle) => wrap180(angle - usual.direction))
}

/** The other channel contradicts this one, and is itself at one with the rows around. */
function windAgrees(mismatchDeg: number, expected: Expectation, otherDeg: number): boolean {
  return (
    Math.abs(mismatchDeg) > CONTRADICTION_DEG &&
    Math.abs(wrap180(otherDeg - expected.angleDeg)) < CONTRADICTION_DEG
  )
}

/**
 * The seam lies dead ahead: while producing the vane stands near it, whatever the rows around read. Where many such rows are
 * off, the logger averages arithmetically, and a mean near zero is no better: 1 second of 360 among 600 near 4 adds half a
 * degree. Then every row is out that extremes or SD do not acquit.
 */
function findVanesAhead(input: AcrossNorthInput, logged: LoggedAngle, seam: number): Uint8Array {
  const { vane, power } = input
  const flags = new Uint8Array(vane.length)
  let producing = 0
  let off = 0
  for (let i = 0; i < flags.length; i++) {
    if (Number.isNaN(vane[i]!)) continue
    const crossed = crossing(logged, i, seam)
    const implausible = power[i]! > 0 && Math.abs(vane[i]!) > PRODUCING_VANE_DEG
    if (crossed === 'proved' || (crossed !== 'no' && implausible)) flags[i] = 1
    if (power[i]! > 0) producing++
    if (power[i]! > 0 && flags[i] === 1) off++
  }
  if (!(off > ARITHMETIC_SHARE * producing)) return flags
  for (let i = 0; i < flags.length; i++) {
    const acquitted = crossing(logged, i, seam) === 'no' || (logged.sd?.[i] ?? NaN) < SD_ACQUITS_DEG
    if (!Number.isNaN(vane[i]!) && !acquitted) flags[i] = 1
  }
  return flags
}

/** The seam lies astern: only a turbine that stands still has its vane pass through it, with the nacelle at rest. */
function findVanesAstern(input: AcrossNorthInput, logged: LoggedAngle, nacelle: Float64Array): Uint8Array {
  const { vane, power } = input
  const near = (i: number): boolean => Math.abs(vane[i] ?? NaN) > 180 - REACH_DEG
  const rests = (i: number, j: number): boolean => Math.abs(wrap180(nacelle[j]! - nacelle[i]!)) < 2
  return Uint8Array.from(vane, (angle, i) => {
    if (Number.isNaN(angle) || power[i]! > 0 || near(i)) return 0
    if (crossing({ mean: vane, sd: logged.sd }, i, -180) === 'proved') return 1
    return near(i - 1) && near(i + 1) && rests(i, i - 1) && rests(i, i + 1) ? 1 : 0
  })
}
