import { InputError } from '../../errors.ts'

/** Whole numbers of so many bits are exact in a double. */
const MOST_BITS = 52

/**
 * Gray code of a number: neighbours differ in one bit, so that a disc read while it turns is never off by more than a step.
 *
 * @param value  whole, 0 to 2^52 - 1; anything else gives NaN.
 * @example grayFromBinary(128) // 192, which is 11000000
 */
export function grayFromBinary(value: number): number {
  return throughBits(value, (bit, above) => bit ^ above.bit)
}

/**
 * The number that a Gray code stands for.
 *
 * @param word  whole, 0 to 2^52 - 1; anything else gives NaN.
 * @example binaryFromGray(0b11000000) // 128
 */
export function binaryFromGray(word: number): number {
  return throughBits(word, (bit, above) => bit ^ above.result)
}

/** Step of a disc of n bits, degrees: 22.5 for 4, 1.40625 for 8. @throws InputError OUT_OF_RANGE unless 1 to 52 whole bits */
export function codeStepDeg(bits: number): number {
  if (!(Number.isInteger(bits) && bits >= 1 && bits <= MOST_BITS)) {
    throw new InputError('OUT_OF_RANGE', `bits: expected a whole number from 1 to ${MOST_BITS}, got ${bits}`)
  }
  return 360 / 2 ** bits
}

/** From the highest bit down; `above`: the bit above and what was made of it. */
function throughBits(
  word: number,
  make: (bit: number, above: { bit: number; result: number }) => number,
): number {
  if (!(Number.isInteger(word) && word >= 0 && word < 2 ** MOST_BITS)) return NaN
  const above = { bit: 0, result: 0 }
  let made = 0
  for (let unit = 2 ** Math.floor(Math.log2(Math.max(1, word))); unit >= 1; unit /= 2) {
    const bit = Math.floor(word / unit) % 2
    const result = make(bit, above)
    above.bit = bit
    above.result = result
    made = 2 * made + result
  }
  return made
}
