import { beforeAll, expect, test } from 'vitest'
import { vaneAndAnemometer } from '../../../src/analysis/index.ts'
import { buildFrame, type Frame, type TurbineColumns } from '../../../src/frame/index.ts'
import { simulateFarm } from '../../../src/simulate/index.ts'
import { SETTINGS } from '../../frame/settings.ts'

let farm: TurbineColumns[]
beforeAll(() => {
  farm = simulateFarm({
    seed: 5,
    turbines: 3,
    days: 12,
    meanWindMs: 9,
    // Two spells: a night in which it also freezes, and a day.
    faults: [
      { kind: 'vane-frozen', turbine: 1, fromS: 2 * 86400, toS: 2 * 86400 + 5 * 3600, size: 0 },
      { kind: 'vane-frozen', turbine: 1, fromS: 8.5 * 86400, toS: 8.5 * 86400 + 3 * 3600, size: 0 },
    ],
  }).turbines.map((one) => ({
    turbine: one.turbine,
    time: one.timeMs,
    numbers: {
      ...one.columns,
      air_temperature: one.columns.air_temperature.map((_, i) => (i < 5 * 144 ? -2 : 8)),
    },
    texts: { status: one.status },
  }))
})

function frameOf(columns: readonly TurbineColumns[]): Frame {
  return buildFrame(columns, {
    site: { runningStatus: ['run', 'limited'] },
    settings: SETTINGS,
    intervalS: 600,
    ratedPowerKw: 2300,
  })
}

test('both frozen spells are named, the one near freezing as likely icing, each with its own times', () => {
  const reports = vaneAndAnemometer(frameOf(farm), SETTINGS)
  const found = reports[1]!.findings.filter(({ kind }) => kind === 'frozen' || kind === 'icing')
  expect(found.map(({ sensor, kind }) => [sensor, kind])).toEqual([
    ['vane', 'icing'],
    ['vane', 'frozen'],
  ])
  const start = farm[1]!.time[0]!
  const hours = found.map(({ from, to }) => [from, to].map((at) => (Date.parse(at!) - start) / 3_600_000))
  // The log has rows of ten minutes.
  expect(Math.abs(hours[0]![0]! - 48)).toBeLessThanOrEqual(1 / 6)
  expect(Math.abs(hours[0]![1]! - 53)).toBeLessThanOrEqual(1 / 6)
  expect(Math.abs(hours[1]![0]! - 204)).toBeLessThanOrEqual(1 / 6)
  expect(Math.abs(hours[1]![1]! - 207)).toBeLessThanOrEqual(1 / 6)
  expect(found[0]!.checkFirst).toMatch(/^At the desk: /)
  for (const i of [0, 2]) {
    expect(reports[i]!.findings.filter(({ severity }) => severity !== 'info')).toEqual([])
  }
})

test('what a log does not allow is said, with what is missing', () => {
  const alone = vaneAndAnemometer(frameOf(farm.slice(0, 1)), SETTINGS)[0]!
  const iced = alone.tests.find(({ test: name }) => name.startsWith('iced'))
  expect(iced).toMatchObject({ sensor: 'anemometer', done: false, note: 'needs 3 turbines' })
  const { vane, ...rest } = farm[0]!.numbers
  expect(vane).toBeDefined()
  const without = vaneAndAnemometer(frameOf([{ ...farm[0]!, numbers: rest }]), SETTINGS)[0]!
  expect(without.tests.filter(({ sensor, done }) => sensor === 'vane' && done)).toEqual([])
})
