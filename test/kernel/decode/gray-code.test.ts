import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  binaryFromGray,
  codeAngles,
  codeStepDeg,
  grayFromBinary,
  potentiometerAngles,
} from '../../../src/kernel/decode/index.ts'

const bitsOf = (value: number, bits: number): string => value.toString(2).padStart(bits, '0')

test('the sixteen words of a four-bit disc come in their order', () => {
  // b xor b / 2 by hand.
  const words = '0000 0001 0011 0010 0110 0111 0101 0100 1100 1101 1111 1110 1010 1011 1001 1000'.split(' ')
  expect(words.map((_, i) => bitsOf(grayFromBinary(i), 4))).toEqual(words)
  expect(words.map((word) => binaryFromGray(Number.parseInt(word, 2)))).toEqual(words.map((_, i) => i))
})

test('an eight-bit disc reads the angles that an encoder manual prints', () => {
  // Printed to a tenth, cut off: 0.0, 1.4, 2.8, 4.2, 178.6 (178.59375 rounded), 180.0.
  const printed: [string, number][] = [
    ['00000000', 0],
    ['00000001', 1.4],
    ['00000011', 2.8],
    ['00000010', 4.2],
    ['01000000', 178.6],
    ['11000000', 180],
  ]
  const words = Float64Array.from(printed, ([word]) => Number.parseInt(word, 2))
  const { angleDeg, invalid } = codeAngles(words, { bits: 8, code: 'gray' })
  expect(invalid).toBe(0)
  printed.forEach(([word, angle], i) => {
    expect(Math.abs(angleDeg[i]! - angle), word).toBeLessThan(0.05)
  })
  expect(angleDeg[5]).toBe(180)
  expect(codeAngles(Float64Array.of(0b10000000), { bits: 8 }).angleDeg[0]).toBe(358.59375)
})

test('from 127 to 128 a binary disc changes eight bits, a Gray disc one', () => {
  const changed = (a: number, b: number): number => bitsOf(a ^ b, 8).replaceAll('0', '').length
  expect(changed(127, 128)).toBe(8)
  expect(changed(grayFromBinary(127), grayFromBinary(128))).toBe(1)
})

test('any number of up to 52 bits comes back from its Gray code, and its neighbour differs in one bit', () => {
  fc.assert(
    fc.property(fc.maxSafeNat(), (number) => {
      const value = number % 2 ** 51
      const word = grayFromBinary(value)
      expect(binaryFromGray(word)).toBe(value)
      const difference = BigInt(word) ^ BigInt(grayFromBinary(value + 1))
      expect(difference & (difference - 1n)).toBe(0n)
    }),
  )
})

test('four bits make 16 sectors of 22.5 degrees, eight make 256 steps of 1.41', () => {
  expect(codeStepDeg(4)).toBe(22.5)
  expect(codeStepDeg(8)).toBe(1.40625)
  for (const bits of [0, 1.5, 53, NaN]) {
    expect(() => codeStepDeg(bits), String(bits)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  }
})

test('zero and direction turn a disc, and the answer stays below 360', () => {
  const words = Float64Array.of(0, 64, 128, 255)
  const { angleDeg } = codeAngles(words, { bits: 8, code: 'binary', zeroDeg: 30, direction: -1 })
  expect([...angleDeg]).toEqual([30, 300, 210, 31.40625])
})

test('words that the disc does not have are no angles, and are counted', () => {
  const { angleDeg, invalid } = codeAngles(Float64Array.of(256, -1, 3.5, NaN, 1), { bits: 8 })
  expect([...angleDeg]).toEqual([NaN, NaN, NaN, NaN, 1.40625])
  expect(invalid).toBe(3)
})

test('a potentiometer spans the turn less its gap', () => {
  const ratios = Float64Array.of(0, 0.5, 1, 1.02, -0.01, NaN)
  const { angleDeg, invalid } = potentiometerAngles(ratios, { deadBandDeg: 10, zeroDeg: 5 })
  // 5 + 350 r by hand: the gap lies from 355 to 5.
  expect([...angleDeg]).toEqual([5, 180, 355, NaN, NaN, NaN])
  expect(invalid).toBe(2)
  expect([...potentiometerAngles(Float64Array.of(0.25), { direction: -1 }).angleDeg]).toEqual([270])
})
