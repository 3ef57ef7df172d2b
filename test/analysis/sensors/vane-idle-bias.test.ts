import { expect, test } from 'vitest'
import { nacelleRecords, vaneIdleBias } from '../../../src/analysis/index.ts'
import type { Frame } from '../../../src/frame/index.ts'
import { madeFarm } from '../changes/offset-changes-farm.ts'

const NORTHS = [40, 3, -120, 0.5, 170]

/** The first turbine stands for four hours a day in wind, and its vane reads `biasDeg` more meanwhile. */
function withIdleHours(days: number, biasDeg: number): Frame {
  const frame = madeFarm(
    days,
    NORTHS.map((north) => ({ northDeg: () => north })),
  )
  const first = frame.turbines[0]!
  for (let i = 0; i < first.time.length; i++) {
    if (i % 144 < 24) {
      first.running[i] = 0
      first.power[i] = -5
      first.vane[i] = first.vane[i]! + biasDeg
      first.indicatedDirection[i] = (first.indicatedDirection[i]! + biasDeg + 360) % 360
    }
  }
  return frame
}
const reportsOf = (frame: Frame) => vaneIdleBias(frame, nacelleRecords(frame, []).consensusDeg)

test.each([9, -6])(
  'a vane that reads %d degrees more at idle than under load is told, with its size',
  (bias) => {
    const [first, ...others] = reportsOf(withIdleHours(20, bias))
    expect(first!.findings).toHaveLength(1)
    expect(first!.findings[0]).toMatchObject({ sensor: 'vane', kind: 'idle-bias', severity: 'warn' })
    // Local noise of 2 degrees over 24 rows a day and 20 days: 0.1 degrees; tenths more from the consensus.
    expect(Math.abs((first!.findings[0]!.detail['biasDeg'] as number) - bias)).toBeLessThan(0.5)
    for (const other of others) {
      expect(other.findings).toEqual([])
      expect(other.tests[0]!.done).toBe(false) // they never stood still
    }
  },
)

test('a vane that reads the same at idle has no finding', () => {
  const [first] = reportsOf(withIdleHours(20, 0))
  expect(first!.findings).toEqual([])
  expect(first!.tests).toMatchObject([{ done: true }])
})

test('a few days settle nothing, and the test says what it needs', () => {
  const [first] = reportsOf(withIdleHours(5, 9))
  expect(first!.findings).toEqual([])
  expect(first!.tests[0]).toMatchObject({ done: false, note: expect.stringContaining('8 days') as string })
})
