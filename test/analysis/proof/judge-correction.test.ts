import { expect, test } from 'vitest'
import {
  gainOfTurning,
  judgeCorrection,
  type Evidence,
} from '../../../src/analysis/proof/judge-correction.ts'

const EVIDENCE: Evidence = {
  enteredDeg: 6,
  headingDeg: { value: 5.9, half: 0.6 },
  daysBefore: 45,
  daysAfter: 45,
  power: { value: 0.0055, half: 0.003 },
  beforeDeg: { value: 6, low: 4.5, high: 7.5 },
  changeDeg: { value: -5.5, half: 2 },
  exponent: 3,
}
const judge = (changed: Partial<Evidence>) => judgeCorrection({ ...EVIDENCE, ...changed })

test('turning a rotor that stands 6 degrees off by 6 gains 1 / cos(6 degrees), the other way cos(12) / cos(6)', () => {
  // By hand: -ln(0.9945218954) and ln(0.978147601 / 0.994521895) at p = 3.
  expect(gainOfTurning(6, 6, 3)).toBeCloseTo(0.0054931645, 9)
  expect(gainOfTurning(6, -6, 3)).toBeCloseTo(-0.0166015, 6)
  expect(gainOfTurning(6, 12, 3)).toBeCloseTo(0, 15)
})

test('a heading that stepped as entered and power that rose: worked, for either sign of the correction', () => {
  expect(judge({}).outcome).toBe('worked')
  const mirrored = judge({
    enteredDeg: -6,
    headingDeg: { value: -5.9, half: 0.6 },
    beforeDeg: { value: -6, low: -7.5, high: -4.5 },
    changeDeg: { value: 5.5, half: 2 },
  })
  expect(mirrored.outcome).toBe('worked')
})

test('a heading that stepped against what was entered is the wrong way, before power has spoken', () => {
  const answer = judge({ headingDeg: { value: -5.5, half: 1.5 }, daysAfter: 1, power: null, changeDeg: null })
  expect(answer).toMatchObject({ outcome: 'wrong way', code: 'heading-other-way' })
})

test('what was entered as written down can still turn a rotor away from the wind: wrong way by the misalignment before', () => {
  const answer = judge({
    beforeDeg: { value: -6, low: -7.5, high: -4.5 },
    daysAfter: 2,
    power: null,
    changeDeg: null,
  })
  expect(answer).toMatchObject({ outcome: 'wrong way', code: 'further-off' })
})

test('a heading that did not step: not taken hold; one that stepped by half: partly', () => {
  expect(judge({ headingDeg: { value: 0.2, half: 0.8 } }).outcome).toBe('not taken hold')
  expect(judge({ headingDeg: { value: 3, half: 0.8 } }).outcome).toBe('partly')
})

test('a heading that cannot tell a step from none asks for days', () => {
  const answer = judge({ headingDeg: { value: 2, half: 5 }, daysAfter: 0.5, power: null })
  expect(answer.outcome).toBe('too early')
  expect(answer.furtherDays).toBeGreaterThan(0)
})

test('a rotor that turned as entered while power stands still beyond chance: no effect seen', () => {
  expect(judge({ power: { value: -0.0005, half: 0.002 } }).outcome).toBe('no effect seen')
})

test('power that cannot tell yet names the days it takes, and more for a wider interval', () => {
  const soon = judge({ daysAfter: 5, power: { value: 0.003, half: 0.0062 } })
  const later = judge({ daysAfter: 5, power: { value: 0.003, half: 0.0075 } })
  expect(soon.outcome).toBe('too early')
  expect(soon.furtherDays).toBeGreaterThan(0)
  expect(later.furtherDays).toBeGreaterThan(soon.furtherDays)
})

test('power alone never says partly, and half the gain is worked or too early', () => {
  for (const value of [0.004, 0.002, 0.001, 0, -0.001]) {
    for (const half of [0.0005, 0.002, 0.008]) {
      expect(judge({ headingDeg: null, power: { value, half } }).outcome).not.toBe('partly')
    }
  }
})

test('power alone: a fall beyond placebos is the wrong way, a fall within them is not', () => {
  expect(judge({ headingDeg: null, power: { value: -0.016, half: 0.008 } }).outcome).toBe('wrong way')
  expect(judge({ headingDeg: null, power: { value: -0.009, half: 0.008 } }).outcome).not.toBe('wrong way')
})

test('neither heading nor power: too early, and days are not promised', () => {
  const answer = judge({ headingDeg: null, power: null, changeDeg: null })
  expect(answer).toMatchObject({ outcome: 'too early', code: 'no-evidence', furtherDays: NaN })
})
