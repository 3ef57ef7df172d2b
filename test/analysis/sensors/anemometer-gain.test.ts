import { beforeAll, expect, test } from 'vitest'
import { anemometerYawResponse, vaneAndAnemometer } from '../../../src/analysis/index.ts'
import { buildFrame, type TurbineColumns } from '../../../src/frame/index.ts'
import { simulateFarm } from '../../../src/simulate/index.ts'
import { SETTINGS } from '../../frame/settings.ts'

const CHANGED_ROW = 15 * 144
let farm: TurbineColumns[]
beforeAll(() => {
  farm = simulateFarm({ seed: 8, turbines: 4, days: 30, wakes: false }).turbines.map((one) => ({
    turbine: one.turbine,
    time: one.timeMs,
    numbers: { ...one.columns },
    texts: { status: one.status },
  }))
})

/** What is found at the anemometers, the second one's wind speed multiplied row by row. */
function findings(factor: (row: number) => number) {
  const columns = farm.map((one, i): TurbineColumns => {
    const speed = one.numbers['wind_speed']!
    if (i !== 1) return one
    return { ...one, numbers: { ...one.numbers, wind_speed: speed.map((value, row) => value * factor(row)) } }
  })
  const frame = buildFrame(columns, {
    site: { runningStatus: ['run', 'limited'] },
    settings: SETTINGS,
    intervalS: 600,
    ratedPowerKw: 2300,
  })
  return vaneAndAnemometer(frame, SETTINGS).map(({ findings: all }) =>
    all.filter(({ sensor }) => sensor === 'anemometer'),
  )
}

test('healthy anemometers have no finding', () => {
  expect(findings(() => 1).flat()).toEqual([])
})

test('an anemometer that reads 8 % less from a day on is dated, and its neighbours are left alone', () => {
  const found = findings((row) => (row >= CHANGED_ROW ? 0.92 : 1))
  expect(
    found.map((all) => all.filter(({ severity }) => severity !== 'info').map(({ kind }) => kind)),
  ).toEqual([[], ['gain-drift'], [], []])
  const { change, steps } = found[1]!.find(({ kind }) => kind === 'gain-drift')!.detail as {
    change: number
    steps: { at: string }[]
  }
  expect(Math.abs(change + 0.08)).toBeLessThan(0.015)
  expect(Math.abs(Date.parse(steps[0]!.at) - farm[0]!.time[CHANGED_ROW]!)).toBeLessThanOrEqual(86_400_000)
})

test('an anemometer that always reads 15 % more is off its gain', () => {
  const found = findings(() => 1.15)
  expect(found[1]!.map(({ kind, severity }) => [kind, severity])).toEqual([['gain-off', 'warn']])
  for (const i of [0, 2, 3]) expect(found[i]!.filter(({ severity }) => severity !== 'info')).toEqual([])
})

test('a response to yaw is told where its interval leaves out 0', () => {
  const frame = buildFrame(farm.slice(0, 1), { site: {}, settings: SETTINGS, intervalS: 600 }).turbines[0]!
  const response = { perDeg: -0.003, sdPerDeg: 0.0004, ownPerDeg: -0.0031, ownSdPerDeg: 0.0006, rows: 3000 }
  expect(anemometerYawResponse(frame, response).findings).toMatchObject([
    { sensor: 'anemometer', kind: 'yaw-response', severity: 'info' },
  ])
  expect(anemometerYawResponse(frame, { ...response, sdPerDeg: 0.002 }).findings).toEqual([])
  expect(anemometerYawResponse(frame, null).tests).toMatchObject([{ done: false }])
})
