import { expect, test } from 'vitest'
import type { TurbineColumns } from '../../../src/frame/index.ts'
import { readiness } from '../../../src/analysis/index.ts'
import { normals } from '../../kernel/stats/normals.ts'
import { answerOf, frameOf, offsetOf, RAD, syntheticColumns } from '../synthetic.ts'
import { SETTINGS } from '../../frame/settings.ts'

/**
 * What the estimate may miss on rows without noise: the measured curve is made of bins, and its points bend a little with the
 * spread of the yaw error inside them. 0.05 degrees is a tenth of what a month of real rows can tell.
 */
const NOISE_FREE_DEG = 0.05

const withVane = (columns: TurbineColumns, change: (vane: number) => number): TurbineColumns => ({
  ...columns,
  numbers: { ...columns.numbers, vane: columns.numbers['vane']!.map(change) },
})

test('rows that follow the model exactly give its offset back, for every exponent', () => {
  for (const exponent of [1.4, 2, 3]) {
    for (const offsetDeg of [-12, -7, -3, -0.5, 0, 1, 4, 12]) {
      const { standing, sheet, failure } = offsetOf(syntheticColumns({ exponent, offsetDeg }), { exponent })
      expect(failure).toBeNull()
      expect(Math.abs(standing!.offsetDeg - offsetDeg), `p ${exponent}, d ${offsetDeg}`).toBeLessThan(
        NOISE_FREE_DEG,
      )
      expect(sheet.estimateDeg).toBe(standing!.offsetDeg)
    }
  }
})

test('the standing misalignment is the offset plus the mean vane', () => {
  // The controller holds its vane 2 degrees off zero, so the rotor stands d + 2 off the wind.
  const { sheet } = offsetOf(syntheticColumns({ offsetDeg: 3, meanVaneDeg: 2 }))
  const columns = syntheticColumns({ offsetDeg: 3, meanVaneDeg: 2 })
  const vane = columns.numbers['vane']!
  const meanVane = vane.reduce((sum, value) => sum + value, 0) / vane.length
  expect(Math.abs(sheet.standingMisalignmentDeg! - (3 + meanVane))).toBeLessThan(NOISE_FREE_DEG)
})

test('a known response of the anemometer is taken out', () => {
  // a v stands for ln(1 + a v), off by 0.03 % of the wind speed at 12 degrees; the wind range is cut on the reading.
  for (const responsePerDeg of [-0.004, -0.001, 0.002]) {
    const { standing } = offsetOf(syntheticColumns({ offsetDeg: 3, responsePerDeg }), {
      assumedResponsePctPerDeg: responsePerDeg * 100,
    })
    expect(Math.abs(standing!.offsetDeg - 3), `a ${responsePerDeg}`).toBeLessThan(2 * NOISE_FREE_DEG)
  }
})

test('a response taken for 0 shifts the offset by 3.28 degrees for each 0.1 %, at p = 3', () => {
  // ln P = 3 ln u + 3 ln cos(v + d), reading u (1 + a v): a v against -v d (radians) is a shift of a (180 / pi)^2 degrees:
  // 0.001 x 3282.8 = 3.283. The sign: a reading that grows with the vane looks like power that falls with it, d > 0.
  for (const responsePerDeg of [-0.003, -0.001, 0.001]) {
    const { standing } = offsetOf(syntheticColumns({ offsetDeg: 0, responsePerDeg }))
    const expected = responsePerDeg * (180 / Math.PI) ** 2
    // tan(d) against d, and 1 + a v against its logarithm, are off by 1 % at 10 degrees.
    expect(Math.abs(standing!.offsetDeg - expected), `a ${responsePerDeg}`).toBeLessThan(
      0.015 * Math.abs(expected) + NOISE_FREE_DEG,
    )
  }
})

test('a response that is not known widens the interval by what it may shift', () => {
  const columns = syntheticColumns({ offsetDeg: 1 })
  const { sheet } = offsetOf(columns, { assumedResponsePctPerDeg: null, responseSpreadPctPerDeg: 0.15 })
  // 1.96 x 0.15 % x 3.283 degrees per 0.1 % = 9.65; the slope of the regression differs from it by the offset's tangent.
  expect(Math.abs(sheet.intervalParts.response! - 9.65)).toBeLessThan(0.3)
  expect(sheet.interval95Deg[1]! - sheet.interval95Deg[0]!).toBeGreaterThan(2 * 9.3)
  expect(offsetOf(columns, { assumedResponsePctPerDeg: 0 }).sheet.intervalParts.response).toBe(0)
})

test('the same rows read with another exponent give offsets in the ratio of the exponents', () => {
  const { byExponent, standing } = offsetOf(syntheticColumns({ offsetDeg: 5 }))
  const at = (exponent: number): number => byExponent.find((shown) => shown.exponent === exponent)!.offsetDeg
  expect(at(3)).toBe(standing!.offsetDeg)
  // p tan(d) is what is seen: tan(d) = 3/p tan(5). The vane spreads, and a smaller p
  // bends less over that spread than the rows do: some per cent.
  for (const exponent of [1.4, 2]) {
    const expected = Math.atan((3 / exponent) * Math.tan(5 * RAD)) / RAD
    expect(Math.abs(at(exponent) / expected - 1), `p ${exponent}`).toBeLessThan(0.05)
  }
})

test('the interval holds the truth in noise, and days make it narrower', () => {
  const half = (days: number, seed: number) => {
    const { sheet } = offsetOf(syntheticColumns({ days, seed, offsetDeg: 4, noise: 0.08, dayNoise: 0.02 }))
    const [low, high] = sheet.interval95Deg as [number, number]
    return {
      half: (high - low) / 2,
      statistical: sheet.intervalParts.statistical!,
      holds: low <= 4 && high >= 4,
    }
  }
  const short = Array.from({ length: 20 }, (_, k) => half(10, 100 + k))
  // At 95 % each, 20 intervals miss more than 4 times with a chance of 0.3 %. Seeds are fixed.
  expect(short.filter(({ holds }) => holds).length).toBeGreaterThanOrEqual(16)
  const long = Array.from({ length: 5 }, (_, k) => half(40, 100 + k))
  const mean = (list: { statistical: number }[]) =>
    list.reduce((sum, one) => sum + one.statistical, 0) / list.length
  // Four times the days: half the error; and of ten days in blocks of four there are 2.5, with a t quantile
  // of 6 against 2.3: together down to a sixth.
  expect(mean(long) / mean(short)).toBeLessThan(0.65)
  expect(mean(long) / mean(short)).toBeGreaterThan(0.1)
})

test('turning every vane by one angle moves the offset back by it and leaves the misalignment', () => {
  const columns = syntheticColumns({ offsetDeg: 3, noise: 0.05 })
  const before = offsetOf(columns)
  for (const turn of [-25, 7.5, 20, 360, 725]) {
    const after = offsetOf(withVane(columns, (vane) => vane + turn))
    const moved = after.standing!.offsetDeg + turn - before.standing!.offsetDeg
    expect(Math.abs(moved - 360 * Math.round(moved / 360)), `turn ${turn}`).toBeLessThan(1e-6)
    expect(Math.abs(after.standing!.standingDeg - before.standing!.standingDeg), `turn ${turn}`).toBeLessThan(
      1e-6,
    )
    for (const end of [0, 1] as const) {
      expect(
        Math.abs(after.standing!.standingInterval95Deg[end] - before.standing!.standingInterval95Deg[end]),
      ).toBeLessThan(1e-6)
    }
  }
})

test('a vane that reads 180 when the rotor faces the wind is one that reads 0', () => {
  const columns = syntheticColumns({ offsetDeg: 3, noise: 0.05 })
  const before = offsetOf(columns).standing!
  const after = offsetOf(withVane(columns, (vane) => vane + 180)).standing!
  expect(Math.abs(after.offsetDeg - before.offsetDeg)).toBeLessThan(1e-6)
  expect(Math.abs(after.standingDeg - before.standingDeg)).toBeLessThan(1e-6)
})

test('mirroring every vane mirrors the offset', () => {
  const columns = syntheticColumns({ offsetDeg: 3, noise: 0.05 })
  const before = offsetOf(columns).standing!
  const after = offsetOf(withVane(columns, (vane) => -vane)).standing!
  expect(Math.abs(after.offsetDeg + before.offsetDeg)).toBeLessThan(1e-6)
  expect(Math.abs(after.standingInterval95Deg[0] + before.standingInterval95Deg[1])).toBeLessThan(1e-6)
})

test('outliers do not move the offset', () => {
  const columns = syntheticColumns({ offsetDeg: 3, noise: 0.03 })
  const draw = normals(8)
  const power = columns.numbers['power']!.map((value, i) =>
    i % 25 === 0 ? value * (0.3 + Math.abs(draw()) * 0.2) : value,
  )
  const before = offsetOf(columns)
  const after = offsetOf({ ...columns, numbers: { ...columns.numbers, power } })
  expect(Math.abs(after.standing!.offsetDeg - before.standing!.offsetDeg)).toBeLessThan(0.5)
})

test('too few rows, or rows on too few days, are told by code', () => {
  const few = offsetOf(syntheticColumns({ days: 1 }))
  expect(few.failure?.code).toBe('too-few-rows')
  expect(few.standing).toBeNull()
  expect(few.sheet.estimateDeg).toBeNull()
  expect(few.sheet.interval95Deg).toEqual([null, null])
  expect(few.sheet.furtherNote).toContain('post a month')
  expect(few.sheet.rows).toBeGreaterThan(0)
  const days = offsetOf(syntheticColumns({ days: 4 }))
  expect(days.failure?.code).toBe('too-few-days')
  expect(days.sheet.days).toBe(4)
  expect(offsetOf(syntheticColumns({ days: 5 })).failure).toBeNull()
})

test('a frame without a used row has no estimate and throws nothing', () => {
  const columns = syntheticColumns({ days: 6 })
  const stopped = { ...columns, numbers: { ...columns.numbers, power: new Float64Array(6 * 144) } }
  expect(offsetOf(stopped).failure?.code).toBe('too-few-rows')
})

test('a vane that stands still, and a channel that is nowhere, block the estimate', () => {
  const columns = syntheticColumns({ days: 6, offsetDeg: 2 })
  const still = frameOf(withVane(columns, () => 1.3))
  const block = readiness(still.frame)
  expect(block?.code).toBe('vane-still')
  expect(block?.finding).toMatchObject({
    sensor: 'vane',
    severity: 'fault',
    from: '2026-01-01T00:00:00.000Z',
    to: '2026-01-07T00:00:00.000Z',
  })
  const answer = answerOf(still.frame, still.days, SETTINGS)
  expect(answer.standing).toBeNull() // without the block too: nothing varies, so nothing can be fitted

  for (const [channel, code] of [
    ['vane', 'vane-missing'],
    ['wind_speed', 'anemometer-missing'],
    ['power', 'power-missing'],
  ] as const) {
    const lost = {
      ...columns,
      numbers: { ...columns.numbers, [channel]: new Float64Array(6 * 144).fill(NaN) },
    }
    expect(readiness(frameOf(lost).frame)?.code).toBe(code)
  }
  expect(readiness(frameOf(columns).frame)).toBeNull()
})

test('power by vane counts each used row once and peaks where the rotor faces the wind', () => {
  const { sheet } = offsetOf(syntheticColumns({ offsetDeg: 6, days: 20 }))
  expect(sheet.bins.reduce((sum, bin) => sum + bin.rows, 0)).toBe(sheet.rows)
  const peak = sheet.bins
    .filter(({ rows }) => rows > 20)
    .reduce((best, bin) => (bin.relativePowerMean! > best.relativePowerMean! ? bin : best))
  expect(Math.abs((peak.vaneFromDeg + peak.vaneToDeg) / 2 + 6)).toBeLessThanOrEqual(2)
})

test('further days are told where days would settle it, and a reference where they would not', () => {
  const noisy = offsetOf(syntheticColumns({ days: 6, offsetDeg: 1.5, noise: 0.3, dayNoise: 0.05 }))
  expect(noisy.sheet.furtherDays).toBeGreaterThan(0)
  expect(noisy.sheet.furtherNote).toContain(`${noisy.sheet.furtherDays!} more days`)
  const unknown = offsetOf(syntheticColumns({ days: 20, offsetDeg: 2 }), { assumedResponsePctPerDeg: null })
  expect(unknown.sheet.furtherDays).toBeNull()
  expect(unknown.sheet.furtherNote).toContain('reference')
  const clear = offsetOf(syntheticColumns({ days: 20, offsetDeg: 8 }))
  expect(clear.sheet.furtherDays).toBeNull()
  expect(clear.sheet.furtherNote).toContain('no more days')
})

test('the sheet shows the offset by condition, a fitted exponent that is not to be used, and tables that count every row', () => {
  const { sheet, frame } = offsetOf(syntheticColumns({ offsetDeg: 4, days: 20, noise: 0.03 }))
  const { groups, sameness, curve, note } = sheet.byCondition
  const speeds = groups.filter(({ condition }) => condition === 'wind-speed')
  expect(speeds.reduce((sum, group) => sum + group.rows, 0)).toBe(sheet.rows)
  expect(sameness.map(({ condition }) => condition)).toEqual(['wind-speed', 'day-night'])
  expect(curve).toBeNull()
  expect(note).toContain('exponent move all groups alike')
  expect(sheet.fittedExponent!.note).toContain('no estimate to be used')
  expect(sheet.powerAgainstVane.rows.reduce((sum, rows) => sum + rows, 0)).toBe(sheet.rows)
  const running = frame.running.filter((runs) => runs === 1).length
  expect(running).toBeGreaterThan(sheet.rows)
  expect(sheet.captureMatrix.rows.reduce((sum, rows) => sum + rows, 0)).toBe(running)
})

test('an offset that grows with wind speed is a table for the controller, with what to look for first', () => {
  const columns = syntheticColumns({ offsetDeg: 0, days: 40, noise: 0.02 })
  const { wind_speed: speed, vane } = columns.numbers as { wind_speed: Float64Array; vane: Float64Array }
  const power = columns.numbers['power']!.map((kw, i) => {
    const d = 2 * (speed[i]! - 8)
    return kw * (Math.cos((vane[i]! + d) * RAD) / Math.cos(vane[i]! * RAD)) ** 3
  })
  const { byCondition } = offsetOf({ ...columns, numbers: { ...columns.numbers, power } }).sheet
  expect(byCondition.note).toContain('damaged, loose or wrongly mounted')
  expect(byCondition.curve!.length).toBeGreaterThan(4)
  for (const { windSpeedMs, standingMisalignmentDeg, interval95Deg } of byCondition.curve!) {
    // The vane averages 0 within 0.3 degrees in a bin; twice the half-width is left once in ten thousand.
    const half = (interval95Deg[1]! - interval95Deg[0]!) / 2
    expect(Math.abs(standingMisalignmentDeg! - 2 * (windSpeedMs - 8)), `${windSpeedMs} m/s`).toBeLessThan(
      2 * half + 0.6,
    )
  }
})
