import { expect, test } from 'vitest'
import { dayBlocks, preferReference, referenceOffset, staticOffset } from '../../../src/analysis/index.ts'
import { buildFrame } from '../../../src/frame/index.ts'
import { simulateFarm } from '../../../src/simulate/index.ts'
import { SETTINGS } from '../../frame/settings.ts'

const farm = simulateFarm({ seed: 4711, turbines: 1, days: 12, offsetsDeg: [6], references: [0] })
const turbine = farm.turbines[0]!

function answers(numbers: Record<string, Float64Array>) {
  const settings = { ...SETTINGS, resamples: 300, assumedResponsePctPerDeg: 0 }
  const frame = buildFrame(
    [{ turbine: 'Q01', time: turbine.timeMs, numbers, texts: { status: turbine.status } }],
    {
      settings,
      intervalS: 600,
      site: {
        runningStatus: ['run', 'limited'],
        turbines: [{ turbine: 'Q01', ratedPowerKw: farm.scenario.ratedPowerKw }],
      },
    },
  )
  const days = frame.calendar.days
  const dayWeights = dayBlocks(days, settings)
  const byPower = staticOffset(frame.turbines[0]!, { settings, dayWeights, days })
  return { byPower, both: preferReference(byPower, referenceOffset(byPower.frame, dayWeights), settings) }
}

test('a reference on the nacelle comes first, power stays beside it, and both hold the truth', () => {
  const { byPower, both } = answers(turbine.columns)
  const [low, high] = both.sheet.interval95Deg as [number, number]
  expect(both.sheet.method).not.toBe(byPower.sheet.method)
  expect(low).toBeLessThan(6)
  expect(high).toBeGreaterThan(6)
  // 1.96 x 0.5 degrees of mounting is in it, and the scatter of days on top.
  expect(both.sheet.intervalParts.instrument).toBeCloseTo(0.98, 2)
  expect(high - low).toBeGreaterThan(1.96)
  expect(both.sheet.estimates.map(({ kind }) => kind)).toEqual(['direct', 'slope'])
  expect(both.sheet.estimates[1]).toEqual(byPower.sheet.estimates[0])
  expect(both.disagreement).toBeNull()
})

test('with a reference the exponent has no say in d', () => {
  const { both } = answers(turbine.columns)
  expect(new Set(both.byExponent.map(({ offsetDeg }) => offsetDeg)).size).toBe(1)
})

test('a reference that is mounted askew by far differs from power beyond chance, and that is said', () => {
  const askew = turbine.columns.reference_yaw_error.map((angle) => angle - 12)
  const { both } = answers({ ...turbine.columns, reference_yaw_error: askew })
  expect(both.disagreement).toMatch(/differ beyond chance/)
})

test('a reference further out than power by no more than a lower exponent explains is no contradiction', () => {
  // 6 degrees read at an exponent of 3 are 9 at 2.
  const further = turbine.columns.reference_yaw_error.map((angle) => angle + 3)
  expect(answers({ ...turbine.columns, reference_yaw_error: further }).both.disagreement).toBeNull()
})

test('without a reference the answer stays as it is', () => {
  const none = new Float64Array(turbine.timeMs.length).fill(NaN)
  const { byPower, both } = answers({ ...turbine.columns, reference_yaw_error: none })
  expect(both).toBe(byPower)
})
