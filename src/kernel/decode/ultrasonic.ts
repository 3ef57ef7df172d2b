import { InputError } from '../../errors.ts'
import { DEG_PER_RAD, RAD_PER_DEG, wrap360 } from '../angle/index.ts'

/** Square of the speed of sound over the sonic temperature, m2/s2/K. @source Kaimal & Gaynor 1991 */
const SOUND_PER_KELVIN = 403
const ZERO_C_K = 273.15
/** Paths whose bearings differ by less cannot tell a direction, as the sine of the angle between them. */
const LEAST_SINE = 0.1

/**
 * Speed of the air along a path, m/s, positive with the forward pulse.
 *
 * @param forwardS, backwardS  times of flight, s, > 0; otherwise NaN.
 * @source time of flight: V = L / 2 (1 / tf - 1 / tr)
 * @example pathSpeedMs(0.2, 571.4285714e-6, 606.0606061e-6) // 10, to 1e-6
 */
export function pathSpeedMs(lengthM: number, forwardS: number, backwardS: number): number {
  return forwardS > 0 && backwardS > 0 ? (lengthM / 2) * (1 / forwardS - 1 / backwardS) : NaN
}

/**
 * Speed of sound on a path, m/s. Wind across the path carries the pulse off: the true one is hypot of this and the wind across.
 *
 * @source time of flight: c = L / 2 (1 / tf + 1 / tr)
 */
export function pathSoundMs(lengthM: number, forwardS: number, backwardS: number): number {
  return forwardS > 0 && backwardS > 0 ? (lengthM / 2) * (1 / forwardS + 1 / backwardS) : NaN
}

/** Sonic temperature, degrees C: that of dry air; moist air reads up to a few degrees high. */
export function sonicTemperatureC(soundMs: number): number {
  return (soundMs * soundMs) / SOUND_PER_KELVIN - ZERO_C_K
}

export interface UltrasonicScale {
  /** Between the transducers of a path, m; the same for all. */
  readonly pathLengthM: number
  /** Bearing that each path's forward pulse travels to, clockwise from the sensor's zero, degrees; two or three. */
  readonly directionsDeg: readonly number[]
}

/** Wind at an ultrasonic anemometer; arrays of length n; NaN where fewer than two paths are there. */
export interface UltrasonicWind {
  readonly speedMs: Float64Array
  /** Where the wind comes from, clockwise from the sensor's zero, [0, 360). */
  readonly directionDeg: Float64Array
  readonly temperatureC: Float64Array
  /** Largest disagreement of three paths in a row, m/s: they measure two unknowns; NaN with two paths. */
  readonly closureMs: Float64Array
}

/**
 * Wind from the times of flight of two or three paths in a plane, by least squares; where one of three is missing, by the
 * other two.
 *
 * @param transitS  forward and backward time of each path in turn, s; 2 x paths arrays of length n; NaN = missing.
 * @throws InputError OUT_OF_RANGE for other than two or three paths, paths that are parallel, a length that is none;
 *   LENGTH_MISMATCH
 */
export function ultrasonicWind(
  transitS: readonly Float64Array[],
  { pathLengthM, directionsDeg }: UltrasonicScale,
): UltrasonicWind {
  const paths = directionsDeg.length
  checkPaths(pathLengthM, directionsDeg)
  const n = transitS[0]?.length ?? 0
  if (transitS.length !== 2 * paths || transitS.some((values) => values.length !== n)) {
    throw new InputError(
      'LENGTH_MISMATCH',
      `transitS: expected ${2 * paths} arrays of one length, got ${transitS.map(({ length }) => length).join(', ')}`,
    )
  }
  const east = directionsDeg.map((bearing) => Math.sin(bearing * RAD_PER_DEG))
  const north = directionsDeg.map((bearing) => Math.cos(bearing * RAD_PER_DEG))
  const speedMs = new Float64Array(n).fill(NaN)
  const directionDeg = new Float64Array(n).fill(NaN)
  const temperatureC = new Float64Array(n).fill(NaN)
  const closureMs = new Float64Array(n).fill(NaN)
  const along = new Float64Array(paths)
  for (let i = 0; i < n; i++) {
    let [ee, en, nn, ve, vn, known] = [0, 0, 0, 0, 0, 0]
    for (let k = 0; k < paths; k++) {
      const speed = pathSpeedMs(pathLengthM, transitS[2 * k]![i]!, transitS[2 * k + 1]![i]!)
      along[k] = speed
      if (Number.isNaN(speed)) continue
      known++
      ee += east[k]! * east[k]!
      en += east[k]! * north[k]!
      nn += north[k]! * north[k]!
      ve += speed * east[k]!
      vn += speed * north[k]!
    }
    const determinant = ee * nn - en * en
    if (known < 2 || !(determinant > LEAST_SINE * LEAST_SINE)) continue
    const toEast = (ve * nn - vn * en) / determinant
    const toNorth = (vn * ee - ve * en) / determinant
    const speed = Math.hypot(toEast, toNorth)
    speedMs[i] = speed
    directionDeg[i] = speed > 0 ? wrap360(Math.atan2(-toEast, -toNorth) * DEG_PER_RAD) : NaN
    let temperature = 0
    let worst = 0
    for (let k = 0; k < paths; k++) {
      if (Number.isNaN(along[k]!)) continue
      const across = toEast * north[k]! - toNorth * east[k]!
      const sound = pathSoundMs(pathLengthM, transitS[2 * k]![i]!, transitS[2 * k + 1]![i]!)
      temperature += sonicTemperatureC(Math.hypot(sound, across))
      worst = Math.max(worst, Math.abs(along[k]! - (toEast * east[k]! + toNorth * north[k]!)))
    }
    temperatureC[i] = temperature / known
    if (known > 2) closureMs[i] = worst
  }
  return { speedMs, directionDeg, temperatureC, closureMs }
}

function checkPaths(pathLengthM: number, directionsDeg: readonly number[]): void {
  if (!(pathLengthM > 0)) {
    throw new InputError('OUT_OF_RANGE', `pathLengthM: expected > 0, got ${pathLengthM}`)
  }
  if (directionsDeg.length !== 2 && directionsDeg.length !== 3) {
    throw new InputError(
      'OUT_OF_RANGE',
      `directionsDeg: expected two or three paths, got ${directionsDeg.length}`,
    )
  }
  directionsDeg.forEach((bearing, k) => {
    const parallel = directionsDeg
      .slice(0, k)
      .some((other) => !(Math.abs(Math.sin((bearing - other) * RAD_PER_DEG)) > LEAST_SINE))
    if (parallel || !Number.isFinite(bearing)) {
      throw new InputError(
        'OUT_OF_RANGE',
        `directionsDeg: expected paths that are not parallel, got ${directionsDeg.join(', ')}`,
      )
    }
  })
}
