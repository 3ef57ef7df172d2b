import { beforeAll, expect, test } from 'vitest'
import { clockLags, clockLagsOf, type ClockLag } from '../../../src/analysis/sensors/clock-lag.ts'
import { buildFrame, type TurbineColumns } from '../../../src/frame/index.ts'
import { simulateFarm } from '../../../src/simulate/index.ts'
import { SETTINGS } from '../../frame/settings.ts'

const HOUR_S = 3600
const DAYS = 14

function farmOf(scenario: Parameters<typeof simulateFarm>[0]): TurbineColumns[] {
  return simulateFarm(scenario).turbines.map((turbine) => ({
    turbine: turbine.turbine,
    time: turbine.timeMs,
    numbers: turbine.columns,
    texts: { status: turbine.status },
  }))
}

const frameOf = (columns: readonly TurbineColumns[]) =>
  buildFrame(columns, { site: { runningStatus: ['run', 'limited'] }, settings: SETTINGS, intervalS: 600 })

let farm: TurbineColumns[]
beforeAll(() => {
  farm = farmOf({ seed: 21, turbines: 5, days: DAYS })
})

/** Lags when the second of the first `turbines` turbines has stamps that are `shiftS(row)` late. */
function lagsWith(shiftS: (row: number) => number, turbines = 5): ClockLag[][] {
  const shifted = farm
    .slice(0, turbines)
    .map((columns, k) =>
      k === 1 ? { ...columns, time: columns.time.map((at, row) => at + 1000 * shiftS(row)) } : columns,
    )
  return clockLagsOf(frameOf(shifted))
}

test.each([600, -600, HOUR_S, -HOUR_S])(
  'a clock that is %i s ahead is found, and no other turbine with it',
  (shift) => {
    for (const turbines of [3, 5]) {
      const lags = lagsWith(() => shift, turbines)
      expect(
        lags.map((found) => found.length),
        `${turbines} turbines`,
      ).toEqual(lags.map((_, k) => (k === 1 ? 1 : 0)))
      // Wind needs minutes from one turbine to the next: half a row.
      expect(Math.abs(lags[1]![0]!.lagS - shift)).toBeLessThan(300)
      expect(lags[1]![0]!.correlation).toBeGreaterThan(lags[1]![0]!.correlationAtZero + 0.1)
    }
  },
)

test('stamps beside the grid of the others are measured, not rounded', () => {
  const lags = lagsWith(() => -300)
  for (const { lagS } of lags[1]!) expect(Math.abs(lagS + 300)).toBeLessThan(200)
  for (const k of [0, 2, 3, 4]) expect(lags[k]).toEqual([])
})

test('a clock that changed by an hour half-way is off from then on', () => {
  const lags = lagsWith((row) => (row >= (DAYS / 2) * 144 ? HOUR_S : 0))
  expect(lags[1]!.length).toBe(1)
  expect(new Date(lags[1]![0]!.fromMs).toISOString()).toBe('2026-03-08T00:00:00.000Z')
  expect(Math.abs(lags[1]![0]!.lagS - HOUR_S)).toBeLessThan(300)
})

test('missing cells do not hide it', () => {
  const gaps = farm.map((columns, k) => ({
    ...columns,
    numbers: {
      ...columns.numbers,
      wind_speed: columns.numbers['wind_speed']!.map((speed, i) => ((i * 7 + k) % 23 === 0 ? NaN : speed)),
    },
    time: k === 1 ? columns.time.map((at) => at + HOUR_S * 1000) : columns.time,
  }))
  expect(clockLagsOf(frameOf(gaps)).map((found) => found.length)).toEqual([0, 1, 0, 0, 0])
})

test('forty healthy turbines, with wind on its way from one to the next, have no finding', () => {
  const findings = [farm, ...[31, 32, 33].map((seed) => farmOf({ seed, turbines: 5, days: DAYS }))].flatMap(
    (columns) => clockLags(frameOf(columns)),
  )
  const wide = clockLags(frameOf(farmOf({ seed: 34, turbines: 20, days: 7 })))
  expect([...findings, ...wide]).toEqual(Array.from({ length: 40 }, () => []))
})

test('two turbines have no majority, and a short log or an empty one says nothing', () => {
  expect(lagsWith(() => HOUR_S, 2)).toEqual([[], []])
  const short = farm.map((columns, k) => ({
    ...columns,
    time: columns.time.slice(0, 200).map((at) => at + (k === 1 ? HOUR_S * 1000 : 0)),
    numbers: Object.fromEntries(
      Object.entries(columns.numbers).map(([name, values]) => [name, values.slice(0, 200)]),
    ),
    texts: {},
  }))
  expect(clockLagsOf(frameOf(short)).flat()).toEqual([])
})

test('the finding says which way and by how much', () => {
  const columns = farm.map((one, k) =>
    k === 1 ? { ...one, time: one.time.map((at) => at - HOUR_S * 1000) } : one,
  )
  const [finding] = clockLags(frameOf(columns))[1]!
  expect(finding).toMatchObject({ sensor: 'clock', severity: 'warn' })
  expect(finding!.finding).toMatch(/about (5[5-9]|6[0-5]) minutes behind the other turbines/)
  expect(finding!.detail['lagS']).toBeLessThan(-3300)
})
