import { expect, test } from 'vitest'
import { dayWeights } from '../../../src/kernel/stats/index.ts'
import {
  steepnessByPower,
  yawMoveOffset,
  type YawMoveOffset,
} from '../../../src/analysis/offset/yaw-move-offset.ts'
import { YawMoveWindows, type HighRateChunk } from '../../../src/analysis/offset/yaw-move-windows.ts'
import { measuredPowerCurve } from '../../../src/kernel/wind/index.ts'
import { normals } from '../../kernel/stats/normals.ts'

const RAD = Math.PI / 180
const SAMPLE_S = 5
const PER_DAY = 86_400 / SAMPLE_S
const DAYS = 8
const KW_AT_ONE = 2

interface Rotor {
  offsetDeg: number
  /** SD of ln u over minutes. */
  windSd?: number
  /** ln u per degree by which the wind stands from its slow direction. */
  linkPerDeg?: number
  seed?: number
}

/** A nacelle that follows a wandering wind once its vane has been 8 degrees off for a minute; P = 2 (u cos(v + d))^3 exactly. */
function logOf({ offsetDeg, windSd = 0, linkPerDeg = 0, seed = 1 }: Rotor): Required<HighRateChunk> {
  const draw = normals(seed)
  const n = DAYS * PER_DAY
  const log = {
    timeMs: Float64Array.from({ length: n }, (_, i) => Date.UTC(2026, 0, 1) + i * SAMPLE_S * 1000),
    vane: new Float64Array(n),
    power: new Float64Array(n),
    nacellePosition: new Float64Array(n),
    day: Int32Array.from({ length: n }, (_, i) => Math.floor(i / PER_DAY)),
    usable: new Uint8Array(n).fill(1),
  }
  const keep = Math.exp(-SAMPLE_S / 120)
  const fresh = Math.sqrt(1 - keep * keep)
  let slow = 0
  let fast = 0
  let gust = 0
  let heading = 40
  let vaneMean = 0
  let heldS = 0
  let yawing = 0
  for (let i = 0; i < n; i++) {
    slow += 0.12 * draw()
    fast = keep * fast + 4 * fresh * draw()
    gust = keep * gust + windSd * fresh * draw()
    // The direction of the axis at which the vane reads 0 is d off the wind.
    const vane = slow + fast - (heading - 40)
    vaneMean = 0.9 * vaneMean + 0.1 * vane
    if (yawing !== 0) {
      heading += yawing * 0.4 * SAMPLE_S
      if (vane * yawing < 1) yawing = 0
    } else {
      heldS = Math.abs(vaneMean) > 7 ? heldS + SAMPLE_S : 0
      if (heldS > 60) yawing = vaneMean > 0 ? 1 : -1
    }
    const speed = 8 * Math.exp(gust + linkPerDeg * fast)
    log.vane[i] = vane
    log.nacellePosition[i] = ((heading % 360) + 360) % 360
    log.power[i] = KW_AT_ONE * (speed * Math.cos((vane + offsetDeg) * RAD)) ** 3
  }
  return log
}

function slice(log: Required<HighRateChunk>, from: number, to: number): Required<HighRateChunk> {
  return {
    timeMs: log.timeMs.slice(from, to),
    vane: log.vane.slice(from, to),
    power: log.power.slice(from, to),
    nacellePosition: log.nacellePosition.slice(from, to),
    day: log.day.slice(from, to),
    usable: log.usable.slice(from, to),
  }
}

function rowsOf(log: Required<HighRateChunk>, chunks = DAYS) {
  const windows = new YawMoveWindows()
  const n = log.timeMs.length
  for (let c = 0; c < chunks; c++) {
    windows.add(slice(log, Math.floor((c * n) / chunks), Math.floor(((c + 1) * n) / chunks)))
  }
  return windows.rows
}

const WEIGHTS = [1, 2].map((blockDays) => dayWeights({ days: DAYS, blockDays, resamples: 300, seed: 1 }))

function offsetOf(log: Required<HighRateChunk>, exponent = 3): YawMoveOffset {
  return yawMoveOffset(rowsOf(log), {
    exponent,
    ratedPowerKw: 5000,
    steepnessAtPower: () => 3,
    dayWeights: WEIGHTS,
    minimumDays: 5,
  })
}

test('in a steady wind the offset comes back, whichever its sign', () => {
  for (const offsetDeg of [0, 5, -7]) {
    const answer = offsetOf(logOf({ offsetDeg }))
    expect(answer.failure).toBe(null)
    expect(answer.moves).toBeGreaterThan(100)
    // Means of a minute stand for the yaw error in it: the curvature of ln cos within it leaves hundredths of a degree.
    expect(Math.abs(answer.offsetDeg - offsetDeg), `d = ${offsetDeg}`).toBeLessThan(0.1)
  }
})

test('half the exponent makes twice the offset of the same log', () => {
  const log = logOf({ offsetDeg: 3 })
  const ratio = offsetOf(log, 1.5).offsetDeg / offsetOf(log, 3).offsetDeg
  // p d is what is seen, as long as cosines are near 1 - x^2 / 2.
  expect(Math.abs(ratio - 2)).toBeLessThan(0.1)
})

test('gusts that come with a turn of the wind do not move the offset', () => {
  const byLink = [0.004, -0.004].map((linkPerDeg) => {
    const log = logOf({ offsetDeg: 5, windSd: 0.04, linkPerDeg, seed: 4 })
    const answer = offsetOf(log)
    expect(answer.halfWidthDeg).toBeLessThan(6)
    expect(Math.abs(answer.offsetDeg - 5)).toBeLessThan(answer.halfWidthDeg)
    return { fitted: answer.offsetDeg, plain: plainOffset(log) }
  })
  // The same noise with either sign of the link: what differs is the link alone.
  expect(Math.abs(byLink[0]!.plain - byLink[1]!.plain)).toBeGreaterThan(3)
  expect(Math.abs(byLink[0]!.fitted - byLink[1]!.fitted)).toBeLessThan(0.5)
})

/** Minute before against minute after and nothing else: to first order ln P gains 3 d (v before - v after). */
function plainOffset(log: Required<HighRateChunk>): number {
  const rows = rowsOf(log)
  let gained = 0
  let takenBack = 0
  rows.travelDeg.forEach((travel, i) => {
    gained += (Math.sign(travel) * rows.logPowerGain[i]!) / 3
    takenBack += Math.sign(travel) * (rows.vaneBeforeDeg[i]! - rows.vaneAfterDeg[i]!) * RAD
  })
  return gained / takenBack / RAD
}

test('what is gathered does not depend on how the log is cut', () => {
  const log = logOf({ offsetDeg: 2, windSd: 0.02 })
  const whole = rowsOf(log, 1)
  const cut = rowsOf(log, 29)
  expect(cut.travelDeg.length).toBe(whole.travelDeg.length)
  expect([...cut.day]).toEqual([...whole.day])
  cut.logPowerGain.forEach((gain, i) => {
    expect(Math.abs(gain - whole.logPowerGain[i]!)).toBeLessThan(1e-9)
  })
})

test('minutes in which the turbine is held back, or in which it stands, are left out', () => {
  const log = logOf({ offsetDeg: 2 })
  log.usable.fill(0, 0, 3 * PER_DAY)
  log.power.fill(-5, 3 * PER_DAY, 4 * PER_DAY)
  const days = new Set(rowsOf(log).day)
  expect([...days].sort()).toEqual([4, 5, 6, 7])
})

test('too few moves, too few days and signs that disagree are refused in words', () => {
  const log = logOf({ offsetDeg: 2 })
  const short = offsetOf(slice(log, 0, PER_DAY))
  expect(short.offsetDeg).toBe(NaN)
  expect(short.failure).toMatch(/needed/)
  log.usable.fill(0, 4 * PER_DAY)
  expect(offsetOf(log).failure).toMatch(/4 days, at least 5/)
  const reversed = logOf({ offsetDeg: 2 })
  reversed.nacellePosition.forEach((position, i) => {
    reversed.nacellePosition[i] = 360 - position
  })
  expect(offsetOf(reversed).failure).toMatch(/signs that disagree/)
})

test('chunks must be whole and in order', () => {
  const log = logOf({ offsetDeg: 0 })
  const windows = new YawMoveWindows()
  windows.add(slice(log, 0, 1000))
  expect(() => {
    windows.add(slice(log, 500, 1500))
  }).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  expect(() => {
    windows.add({ ...slice(log, 1000, 1500), power: new Float64Array(3) })
  }).toThrow(expect.objectContaining({ code: 'LENGTH_MISMATCH' }))
})

test('steepness by power is that of the curve at the speed which makes the power', () => {
  const speeds = Float64Array.from({ length: 4000 }, (_, i) => 3 + (8 * i) / 4000)
  const curve = measuredPowerCurve(
    speeds,
    speeds.map((speed) => 2 * speed ** 3),
  )
  const steepness = steepnessByPower(curve)
  // The cube has the steepness 3 everywhere; a parabola of ln P over ln u is exact for it.
  for (const powerKw of [100, 500, 1500]) expect(steepness(powerKw)).toBeCloseTo(3, 2)
  expect(steepness(1e6)).toBe(NaN)
  expect(steepness(0)).toBe(NaN)
})
