import { expect, test } from 'vitest'
import { verdictOf } from '../../../src/analysis/index.ts'

const verdict = (m: number, low: number, high: number, threshold = 3): string =>
  verdictOf(m, [low, high], threshold).verdict

test('offset: |m| reaches the threshold and the nearer end lies beyond half of it', () => {
  expect(verdict(6, 5, 7)).toBe('offset')
  expect(verdict(-6, -7, -5)).toBe('offset')
  expect(verdict(3, 1.51, 4.5)).toBe('offset') // m at the threshold counts
  expect(verdict(-3, -4.5, -1.51)).toBe('offset')
  expect(verdict(3, 1.5, 4.5)).toBe('undetermined') // the nearer end at half does not
  expect(verdict(2.99, 1.6, 4.4)).toBe('undetermined')
  expect(verdict(9, -1, 19)).toBe('undetermined')
})

test('aligned: the whole interval lies inside the threshold', () => {
  expect(verdict(0, -2.9, 2.9)).toBe('aligned')
  expect(verdict(2, 1, 2.99)).toBe('aligned')
  expect(verdict(-2.5, -2.9, -2.1)).toBe('aligned')
  expect(verdict(0, -3, 2.9)).toBe('undetermined') // an end at the threshold is not inside
  expect(verdict(0, -2.9, 3)).toBe('undetermined')
  expect(verdict(0, -12, 12)).toBe('undetermined')
})

test('the threshold is the one that is given', () => {
  expect(verdict(6, 5, 7, 7)).toBe('undetermined')
  expect(verdict(6, 5, 7, 8)).toBe('aligned')
  expect(verdict(1.2, 0.9, 1.5, 1)).toBe('offset')
})

test('numbers that are not known settle nothing', () => {
  expect(verdict(NaN, NaN, NaN)).toBe('undetermined')
  expect(verdict(6, NaN, NaN)).toBe('undetermined')
  expect(verdict(0, NaN, NaN)).toBe('undetermined')
  expect(verdict(0, -1, NaN)).toBe('undetermined')
})

test('the sentence shows the angle with its sign and interval, and the code is stable', () => {
  const offset = verdictOf(-6.04, [-7.5, -4.6], 3)
  expect(offset.code).toBe('beyond-threshold')
  expect(offset.text).toContain('-6.0 degrees (95 %: -7.5 to -4.6)')
  expect(verdictOf(0.5, [-1, 2], 3)).toMatchObject({ code: 'inside-threshold' })
  expect(verdictOf(0.5, [-10, 11], 3)).toMatchObject({ code: 'interval-too-wide' })
  expect(verdictOf(0.5, [-1, 2], 3).text).toContain('+0.5')
})

test('where only the exponent stands between the turbine and aligned, the sentence says so', () => {
  const given = { exponent: 3, interval95Deg: [-2, 2.6] } as const
  const open = verdictOf(0.3, [-2.5, 3.4], 3, given)
  expect(open).toMatchObject({ verdict: 'undetermined', code: 'exponent-not-known' })
  expect(open.text).toMatch(/were the exponent known to be 3.*-2\.0 to \+2\.6.*let it reach \+3\.4/)
  expect(verdictOf(0.3, [-4, 4], 3, { exponent: 3, interval95Deg: [-3.5, 3.5] }).code).toBe(
    'interval-too-wide',
  )
  expect(verdictOf(6, [5, 12], 3, { exponent: 3, interval95Deg: [5, 7] }).verdict).toBe('offset')
})
