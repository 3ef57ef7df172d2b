import { expect, test } from 'vitest'
import { yawActivity, yawDay, yawFindings } from '../../../src/analysis/index.ts'
import type { HighRateRows } from '../../../src/analysis/high-rate/high-rate-rows.ts'
import { madeFarm } from '../changes/offset-changes-farm.ts'

const RATE_DEG_S = 0.4

/** A day at 1 Hz: every 12 minutes the vane stands at +10 or -10 for two minutes, then the nacelle turns 8 degrees after it. */
function day(rateDegS = RATE_DEG_S, turnsBack = false): HighRateRows {
  const n = 86_400
  const position = new Float64Array(n)
  const vane = new Float64Array(n)
  let at = 350
  for (let i = 0; i < n; i++) {
    const round = Math.floor(i / 720)
    const sign = turnsBack ? 1 : round % 2 === 0 ? 1 : -1
    const second = i % 720
    const lasts = 8 / rateDegS
    if (second >= 300 && second < 300 + lasts) at += sign * rateDegS
    if (turnsBack && second >= 420 && second < 420 + lasts) at -= rateDegS
    position[i] = ((at % 360) + 360) % 360
    vane[i] =
      second >= 180 && second < 300 ? 10 * sign : second < 300 + lasts && second >= 300 ? 5 * sign : 2 * sign
  }
  const ones = new Uint8Array(n).fill(1)
  const missing = new Float64Array(n).fill(NaN)
  return {
    turbine: 'T1',
    dayMs: 0,
    first: 0,
    end: n,
    sampleS: 1,
    timeMs: Float64Array.from({ length: n }, (_, i) => i * 1000),
    windSpeed: missing,
    vane,
    vane2: missing,
    nacellePosition: position,
    power: missing,
    pitch: missing,
    rotorSpeed: missing,
    yawActive: missing,
    airTemperature: missing,
    running: ones,
    limited: new Uint8Array(n),
  }
}

const turbine = madeFarm(6, [{}]).turbines[0]!

test('moves, rate, threshold and stop point are told from rows of seconds, over north', () => {
  const yaw = yawActivity(turbine, [yawDay(day())!])
  // 86,400 / 720 moves of 8 degrees in 20 s, half of them each way.
  expect(yaw).toMatchObject({ source: 'high-rate', lowerBounds: false, moves: 120, clockwiseMovesShare: 0.5 })
  expect(yaw.daysCovered).toBeCloseTo(1, 3)
  expect(Math.abs(yaw.travelDegPerDay! - 960)).toBeLessThan(5)
  expect(Math.abs(yaw.medianRateDegS! - RATE_DEG_S)).toBeLessThan(0.03)
  expect(Math.abs(yaw.startThresholdDeg! - 10)).toBeLessThan(0.5)
  expect(Math.abs(yaw.stopPointDeg! - 2)).toBeLessThan(0.5)
  // The mean of half a minute is past half of 10 some 10 s after the vane went there, 120 s before the start.
  expect(Math.abs(yaw.delayS! - 110)).toBeLessThan(10)
  expect(yaw.huntingShare).toBe(0)
  expect(yawFindings(turbine, yaw)).toEqual([])
})

test('a slow drive and one that turns back at once are named', () => {
  const slow = yawActivity(turbine, [yawDay(day(0.08))!])
  expect(yawFindings(turbine, slow).map(({ kind }) => kind)).toEqual(['slow-yaw'])
  const hunting = yawActivity(turbine, [yawDay(day(RATE_DEG_S, true))!])
  expect(hunting.huntingShare).toBeCloseTo(0.5, 2)
  expect(yawFindings(turbine, hunting).map(({ kind }) => kind)).toContain('hunting')
})

test('rows of means give lower bounds and say so', () => {
  const yaw = yawActivity(turbine, [])
  expect(yaw).toMatchObject({
    source: 'intervals',
    lowerBounds: true,
    medianRateDegS: null,
    startThresholdDeg: null,
  })
  expect(yaw.moves).toBeGreaterThan(100)
  expect(yaw.bySector.reduce((sum, { rows }) => sum + rows, 0)).toBe(turbine.time.length)
})

test('a day without position, or of slow rows, tells nothing', () => {
  expect(yawDay({ ...day(), sampleS: 60 })).toBeNull()
  const rows = day()
  expect(yawDay({ ...rows, nacellePosition: rows.nacellePosition.map(() => NaN) })).toBeNull()
})
