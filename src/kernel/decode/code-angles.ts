import { wrap360 } from '../angle/index.ts'
import { binaryFromGray, codeStepDeg } from './gray-code.ts'

/** How an angle stands in a sensor: what it reads at its own zero, and which way it counts. */
export interface AngleScale {
  /** Angle at the code, ratio or count 0, degrees. Default 0. */
  readonly zeroDeg?: number | undefined
  /** 1: rises clockwise; -1: counter-clockwise. Default 1. */
  readonly direction?: 1 | -1 | undefined
}

export interface CodeScale extends AngleScale {
  /** Bits of the disc, 1 to 52. */
  readonly bits: number
  /** Default: gray. */
  readonly code?: 'gray' | 'binary' | undefined
}

/** Angles that raw words stand for. */
export interface DecodedAngles {
  /** Degrees, [0, 360); length n; NaN = missing, or no word of this sensor. */
  readonly angleDeg: Float64Array
  /** Readings that are there but no words of this sensor: not whole, below 0, beyond its bits. */
  readonly invalid: number
}

/**
 * Angles of an absolute encoder from its words.
 *
 * @param words  whole numbers, 0 to 2^bits - 1; length n; NaN = missing.
 * @throws InputError OUT_OF_RANGE for a number of bits that no disc has
 * @example codeAngles(Float64Array.of(0b11000000), { bits: 8 }).angleDeg[0] // 180
 */
export function codeAngles(words: Float64Array, scale: CodeScale): DecodedAngles {
  const { bits, code = 'gray', zeroDeg = 0, direction = 1 } = scale
  const stepDeg = codeStepDeg(bits)
  const codes = 2 ** bits
  let invalid = 0
  const angleDeg = words.map((word) => {
    if (Number.isNaN(word)) return NaN
    if (!(Number.isInteger(word) && word >= 0 && word < codes)) {
      invalid++
      return NaN
    }
    return wrap360(zeroDeg + direction * stepDeg * (code === 'gray' ? binaryFromGray(word) : word))
  })
  return { angleDeg, invalid }
}

/**
 * Angles of a potentiometer from the ratio of its wiper. The track leaves a gap, in which the wiper floats: the ratios 0 to 1
 * span 360 less the gap, from `zeroDeg` on.
 *
 * @param ratios  no unit, 0 to 1; length n; NaN = missing. Outside of it there is no angle.
 * @param scale.deadBandDeg  the gap, degrees, 0 to below 360. Default 0.
 * @example potentiometerAngles(Float64Array.of(0.5), { deadBandDeg: 10 }).angleDeg[0] // 175
 */
export function potentiometerAngles(
  ratios: Float64Array,
  scale: AngleScale & { readonly deadBandDeg?: number | undefined } = {},
): DecodedAngles {
  const { deadBandDeg = 0, zeroDeg = 0, direction = 1 } = scale
  const spanDeg = 360 - deadBandDeg
  let invalid = 0
  const angleDeg = ratios.map((ratio) => {
    if (Number.isNaN(ratio)) return NaN
    if (!(ratio >= 0 && ratio <= 1)) {
      invalid++
      return NaN
    }
    return wrap360(zeroDeg + direction * spanDeg * ratio)
  })
  return { angleDeg, invalid }
}
