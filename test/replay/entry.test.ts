import { expect, test } from 'vitest'
import { entryOf } from '../../src/replay/entry.ts'
import { turbineExample } from '../http/sheet-example.ts'

const standing = {
  offsetDeg: 7,
  standingDeg: 5,
  standingInterval95Deg: [4, 6],
  standingInterval95GivenExponentDeg: [4, 6],
  endExponents: [3, 3],
  gainInEstimate: 2,
} as const

const entry = (change: object, question: Partial<Parameters<typeof entryOf>[1]> = {}) =>
  entryOf(
    {
      ...turbineExample('Q01', 5).staticOffset,
      signChecked: true,
      vaneLogged: 'beforeCorrection',
      ...change,
    },
    { verdict: 'offset', correctionDeg: 2, standing, ...question },
  )

test('what is entered is m: on top of the correction in force, or as a turn of the mark the other way round', () => {
  expect(entry({})).toMatchObject({ addToVaneDeg: 5, vaneOffsetAfterDeg: 7, turnMarkDeg: -5 })
  expect(entry({}, { correctionDeg: undefined })).toMatchObject({ addToVaneDeg: 5, vaneOffsetAfterDeg: NaN })
})

test('no number is to be entered without a verdict, a checked sign, and the kind of logged vane', () => {
  const none = { addToVaneDeg: NaN, vaneOffsetAfterDeg: NaN, turnMarkDeg: NaN }
  expect(entry({ signChecked: false })).toMatchObject(none)
  expect(entry({ vaneLogged: 'unknown' })).toMatchObject(none)
  expect(entry({}, { verdict: 'undetermined' })).toMatchObject(none)
  expect(entry({}, { verdict: 'aligned' })).toMatchObject(none)
})

test('d, the mean vane and m are told apart for each kind of logged vane', () => {
  for (const [vaneLogged, words] of [
    ['beforeCorrection', /d is the whole correction.*\+7\.0 - 2\.0 = \+5\.0 is what is left/],
    ['afterCorrection', /already contains.*\+7\.0 - 2\.0 = \+5\.0 is what is left/],
    ['unknown', /not known.*\+7\.0 - 2\.0 = \+5\.0 is what is left/],
  ] as const) {
    expect(entry({ vaneLogged }).text).toMatch(words)
  }
  expect(entry({}, { standing: null }).text).toContain('nothing to enter')
})

test('a vane of gain k makes k m and k^2 m of what the slope of power finds, and m and k m of what a reference finds', () => {
  const at13 = (gainInEstimate: 1 | 2) =>
    entry({}, { standing: { ...standing, gainInEstimate } }).vaneGain.ifGain.find(({ gain }) => gain === 1.3)!
  // v = k g - d: power finds d / k^2, the rotor stands off d / k, and d is what brings the vane right.
  expect(at13(2).standsOffDeg).toBeCloseTo(1.3 * 5, 12)
  expect(at13(2).enterDeg).toBeCloseTo(1.69 * 5, 12)
  expect(at13(1).standsOffDeg).toBe(5)
  expect(at13(1).enterDeg).toBeCloseTo(1.3 * 5, 12)
})
