import { beforeAll, expect, test } from 'vitest'
import { DAY_MS, highRateRows, vaneHighRate } from '../../../src/analysis/index.ts'
import { vaneDay } from '../../../src/analysis/sensors/vane-day.ts'
import { buildFrame, type TurbineFrame } from '../../../src/frame/index.ts'
import { simulateFarm, type FarmScenario } from '../../../src/simulate/index.ts'
import type { SensorFinding } from '../../../src/sheet/index.ts'
import { SETTINGS } from '../../frame/settings.ts'

const DAYS = 6
const SCENARIO: Partial<FarmScenario> = { seed: 12, turbines: 1, days: DAYS, meanWindMs: 8, stops: false }
/** Second of the log from which on things change. */
const CHANGED_S = 3 * 86_400

let frame: TurbineFrame
let time: Float64Array
let numbers: Record<string, Float64Array>
beforeAll(() => {
  const rows = simulateFarm({ ...SCENARIO, rateS: 600 }).turbines[0]!
  frame = buildFrame(
    [{ turbine: rows.turbine, time: rows.timeMs, numbers: rows.columns, texts: { status: rows.status } }],
    { site: { runningStatus: ['run', 'limited'] }, settings: SETTINGS, intervalS: 600, ratedPowerKw: 2300 },
  ).turbines[0]!
  const seconds = simulateFarm({ ...SCENARIO, rateS: 1 }).turbines[0]!
  time = seconds.timeMs
  const { vane, wind_speed, nacelle_position } = seconds.columns
  const air_temperature = new Float64Array(time.length).fill(9)
  numbers = { wind_speed, nacelle_position, air_temperature, vane: vane.map((value) => rounded(value)) }
})

const rounded = (value: number): number => Math.round(100 * value) / 100

function found(vane: (value: number, second: number) => number): readonly SensorFinding[] {
  const changed = { ...numbers, vane: numbers['vane']!.map(vane) }
  const days = Array.from({ length: DAYS }, (_, day) => {
    const dayMs = frame.time[0]! + day * DAY_MS
    const from = Math.max(0, day * 86_400 - 1200)
    const to = Math.min(time.length, (day + 1) * 86_400 + 1200)
    const span = {
      time: time.slice(from, to),
      numbers: Object.fromEntries(Object.entries(changed).map(([name, all]) => [name, all.slice(from, to)])),
    }
    return { dayMs, vane: vaneDay(highRateRows(frame, dayMs, span)) }
  })
  const report = vaneHighRate(frame, days)
  expect(report.tests.every(({ note }) => note !== '')).toBe(true)
  return report.findings
}

test('a healthy vane at 1 Hz has no finding, and leads the yaw moves', () => {
  expect(found((value) => value)).toEqual([])
})

test('a vane that stands for a quarter of an hour in wind is found, with its times', () => {
  // In wind, and not over midnight.
  let from = 86_400
  while (!(
    numbers['wind_speed']!.slice(from, from + 900).every((speed) => speed > 4) && from % 86_400 < 80_000
  ))
    from += 600
  const spells = found((value, second) => (second >= from && second < from + 900 ? 3.25 : value))
  expect(spells.map(({ kind, severity }) => [kind, severity])).toEqual([['frozen', 'warn']])
  expect(Math.abs(Date.parse(spells[0]!.from!) - time[from]!)).toBeLessThanOrEqual(2000)
})

test('a noise floor that doubles is dated to the day', () => {
  const noisy = found((value, second) =>
    second >= CHANGED_S ? rounded(value + (second % 2 === 0 ? 6 : -6)) : value,
  )
  expect(noisy.map(({ kind }) => kind)).toEqual(['noise-changed'])
  expect(noisy[0]!.from).toBe(new Date(time[CHANGED_S]!).toISOString())
})

test('single readings that jump away are spikes', () => {
  const spiky = found((value, second) => (second % 5003 === 0 ? value + 90 : value))
  expect(spiky.map(({ kind, severity }) => [kind, severity])).toEqual([['spikes', 'warn']])
})

test('an encoder that loses its two finest bits is dated, and one with a stuck bit is named', () => {
  const step = 360 / 512
  const coded = (value: number, stick: (code: number) => number): number => {
    const code = stick((Math.round(value / step) + 512) % 512)
    return rounded(step * (code >= 256 ? code - 512 : code))
  }
  const coarse = found((value, second) => coded(value, (code) => (second >= CHANGED_S ? code & ~3 : code)))
  expect(coarse.filter(({ kind }) => kind === 'coarse-step').map(({ from }) => from)).toEqual([
    new Date(time[CHANGED_S]!).toISOString(),
  ])
  const stuck = found((value) => coded(value, (code) => code & ~4)).filter(({ kind }) => kind === 'stuck-bit')
  expect(stuck.map(({ detail }) => detail)).toMatchObject([{ binaryBit: 2, bits: 9 }])
  expect(found((value) => coded(value, (code) => code)).map(({ kind }) => kind)).not.toContain('stuck-bit')
})

test('a gap that a potentiometer never reads is a dead sector', () => {
  const dead = found((value) => (value > 3 && value < 9 ? (value < 6 ? 3 : 9) : value))
  expect(dead.filter(({ kind }) => kind === 'dead-sector').map(({ detail }) => detail)).toMatchObject([
    { fromDeg: 4, toDeg: 8 }, // whole bins of two degrees inside
  ])
})

test('a vane that yaw moves no longer follow is found', () => {
  // Another vane steers: this one is played a quarter of a day late.
  const { vane } = numbers
  const lost = found((value, second) => (second >= CHANGED_S ? vane![second - 21_600]! : value))
  expect(lost.map(({ kind, severity }) => [kind, severity])).toEqual([['no-longer-leads', 'warn']])
})

test('without high-rate rows every test says what it needs', () => {
  const { tests, findings } = vaneHighRate(frame, null)
  expect(findings).toEqual([])
  expect(tests.map(({ done }) => done)).toEqual(tests.map(() => false))
  expect(tests.length).toBeGreaterThan(5)
})
