import { circularMean, wrap180 } from '../kernel/angle/index.ts'

/**
 * A running vane this far from half a turn, or nearer, is centred on 180, degrees. Offsets beyond some 15 degrees are rare;
 * between 60 and 120 neither centre is plain.
 */
const CENTRE_REACH_DEG = 60
/** A running vane stays near one direction: a spread of about 20 degrees. An absolute direction goes round. */
const RUNNING_RESULTANT = 0.94
/** Below this the vane of a running turbine points anywhere, and is none. */
const ANY_DIRECTION_RESULTANT = 0.5
/** Fewer producing rows than this decide nothing. */
const FEW_ROWS = 20

/** The vane as it was logged; arrays of length n, NaN = missing. */
export interface LoggedVane {
  readonly vane?: Float64Array | undefined
  readonly vaneMin?: Float64Array | undefined
  readonly vaneMax?: Float64Array | undefined
  readonly vaneSd?: Float64Array | undefined
  readonly windDirection?: Float64Array | undefined
  readonly nacellePosition?: Float64Array | undefined
  /** kW. Tells which rows produce; where it is missing throughout, all rows count. */
  readonly power: Float64Array
  /** 1: positive = wind from clockwise of the axis; -1: the reverse. */
  readonly sign: 1 | -1
  /** What the vane reads when the rotor faces the wind, where that is stated. */
  readonly centre?: 0 | 180 | undefined
}

/** The vane of the frame. */
export interface ConventionalVane {
  /** Degrees, [-180, 180), positive = wind from clockwise of the axis; length n. */
  readonly vane: Float64Array
  /**
   * Lowest and highest vane inside the interval, degrees, turned as the vane is; they may run beyond half a turn so that
   * they lie on either side of the mean. NaN where they are not logged, or where the reading wrapped inside the interval.
   */
  readonly vaneMin: Float64Array
  readonly vaneMax: Float64Array
  /** As logged: a turn or a reversal does not change a spread; degrees. NaN where the vane was worked out. */
  readonly vaneSd: Float64Array
  readonly source: 'vane' | 'wind direction less nacelle position' | 'none'
  readonly centreDeg: 0 | 180
  readonly notes: readonly string[]
}

/**
 * One convention for every vane: zero when the rotor faces the wind, clockwise positive. A vane whose mean while producing
 * lies near half a turn is one centred on 180. Without a vane, an absolute wind direction less the nacelle position stands
 * in: of the means of an interval that is an approximation, good while nacelle and wind turn little inside it.
 */
export function conventionalVane(logged: LoggedVane): ConventionalVane {
  const n = logged.power.length
  const missing = new Float64Array(n).fill(NaN)
  const { windDirection, nacellePosition, sign } = logged
  const notes: string[] = []
  let source: ConventionalVane['source'] = 'none'
  let raw: Float64Array = missing
  if (logged.vane && logged.vane.some((angle) => !Number.isNaN(angle))) {
    source = 'vane'
    raw = logged.vane
  } else if (windDirection && nacellePosition) {
    source = 'wind direction less nacelle position'
    raw = windDirection.map((direction, i) => direction - nacellePosition[i]!)
    notes.push(
      'no vane in the log: it is worked out as wind_direction less nacelle_position; differences of means of an interval are approximations',
    )
  }
  const running = circularMean(raw.filter((_, i) => produces(logged.power, i)))
  const centreDeg = logged.centre ?? centreOf(running)
  if (centreDeg === 180 && logged.centre === undefined) {
    notes.push(
      `the vane reads ${Math.round(running.direction)} degrees on average while producing: it is taken as centred on 180, and 180 is taken off`,
    )
  }
  const offCentre = Math.abs(wrap180(running.direction - centreDeg))
  if (running.count >= FEW_ROWS && running.resultant < ANY_DIRECTION_RESULTANT) {
    notes.push(
      `the ${source === 'vane' ? 'vane' : 'difference of wind direction and nacelle position'} points anywhere while producing (resultant ${running.resultant.toFixed(2)}): it is no wind direction relative to the nacelle; check the column map`,
    )
  } else if (running.count >= FEW_ROWS && source === 'vane' && offCentre > CENTRE_REACH_DEG) {
    notes.push(
      `the vane reads ${Math.round(running.direction)} degrees on average while producing, near neither 0 nor 180: state vane.centre, or check the column map`,
    )
  }
  const own = source === 'vane'
  const vane = raw.map((angle) => wrap180(sign * (angle - centreDeg)))
  const extremes = own ? turnedExtremes(logged, vane, raw, sign) : { min: missing, max: missing }
  return {
    vane,
    vaneMin: extremes.min,
    vaneMax: extremes.max,
    vaneSd: own ? (logged.vaneSd ?? missing) : missing,
    source,
    centreDeg,
    notes,
  }
}

function produces(power: Float64Array, i: number): boolean {
  return power[i]! > 0
}

function centreOf(running: { direction: number; resultant: number; count: number }): 0 | 180 {
  const nearHalfTurn = Math.abs(wrap180(running.direction - 180)) < CENTRE_REACH_DEG
  return running.count >= FEW_ROWS && running.resultant > RUNNING_RESULTANT && nearHalfTurn ? 180 : 0
}

/** Extremes keep their distance from the mean; a reversal swaps them. */
function turnedExtremes(
  logged: LoggedVane,
  vane: Float64Array,
  raw: Float64Array,
  sign: 1 | -1,
): { min: Float64Array; max: Float64Array } {
  const min = new Float64Array(vane.length).fill(NaN)
  const max = new Float64Array(vane.length).fill(NaN)
  const { vaneMin, vaneMax } = logged
  if (!vaneMin || !vaneMax) return { min, max }
  for (let i = 0; i < vane.length; i++) {
    const below = raw[i]! - vaneMin[i]!
    const above = vaneMax[i]! - raw[i]!
    // Beyond half a turn, or on the wrong side of the mean, the reading wrapped and its extremes mean nothing.
    if (!(below >= 0 && above >= 0 && below + above < 180)) continue
    min[i] = vane[i]! - (sign === 1 ? below : above)
    max[i] = vane[i]! + (sign === 1 ? above : below)
  }
  return { min, max }
}
