import { expect, test } from 'vitest'
import { buildFrame, REASON_CODE, type TurbineFrame } from '../../src/frame/index.ts'
import { simulateFarm, type SimulatedFarm } from '../../src/simulate/index.ts'
import { columnsOf } from './columns.ts'
import { SETTINGS } from './settings.ts'

const N = 432
const AVERAGED = REASON_CODE['averaged-across-north']
/** The row that the tests spoil. */
const ROW = 200

const wrap360 = (angle: number): number => ((angle % 360) + 360) % 360
const wrap180 = (angle: number): number => wrap360(angle + 180) - 180

/** A nacelle that hunts a few degrees about a direction, in steps every half hour. */
const hunting = (about: number): Float64Array =>
  Float64Array.from({ length: N }, (_, i) => about + 6 * Math.sin(Math.floor(i / 3) * 2.1))
const QUIET_VANE = Float64Array.from({ length: N }, (_, i) => 2 * Math.sin(i * 1.7))
const withRow = (angles: Float64Array, value: number): Float64Array =>
  angles.map((angle, i) => (i === ROW ? value : angle))

function frameOf(numbers: Record<string, Float64Array>): TurbineFrame {
  const columns = columnsOf(N, { vane: QUIET_VANE, ...numbers })
  return buildFrame([columns], { site: {}, settings: SETTINGS, intervalS: 600 }).turbines[0]!
}

const flagged = (frame: TurbineFrame): number[] =>
  [...frame.reason.keys()].filter((i) => frame.reason[i] === AVERAGED)

test('a nacelle reading that contradicts the rows around it, near north, is set aside by its own reason', () => {
  const frame = frameOf({ nacelle_position: withRow(hunting(0).map(wrap360), 171) })
  expect(flagged(frame)).toEqual([ROW])
  expect(frame.averagedAcrossNorth).toEqual({ vane: 0, nacelle_position: 1, wind_direction: 0 })
  // The bad angle reaches no other question; vane and power of the row are good.
  expect(frame.nacellePosition[ROW]).toBeNaN()
  expect(frame.indicatedDirection[ROW]).toBeNaN()
  expect(frame.running[ROW]).toBe(1)
  expect(frame.vane[ROW]).toBe(QUIET_VANE[ROW])
  expect(frame.reason[ROW + 1]).not.toBe(REASON_CODE['fast-change'])
  expect(frame.notes.join()).toContain('nacelle_position was averaged across the end of its scale in 1 rows')
})

test('the same reading far from north is none of this kind', () => {
  const frame = frameOf({
    nacelle_position: withRow(hunting(90).map(wrap360), 171).map((angle, i) =>
      i < 9 ? wrap360(i * 50) : angle,
    ),
  })
  expect(flagged(frame)).toEqual([])
})

test('a signed scale jumps in the south, a wound one nowhere', () => {
  const south = hunting(180)
  expect(flagged(frameOf({ nacelle_position: withRow(south.map(wrap180), 20) }))).toEqual([ROW])
  expect(flagged(frameOf({ nacelle_position: withRow(hunting(0), 171) }))).toEqual([]) // -6 to 6, 171: no jump seen
  expect(flagged(frameOf({ nacelle_position: withRow(hunting(720), 890) }))).toEqual([])
})

test('a nacelle that moved there and back is not flagged when its vane says so', () => {
  const moved = withRow(hunting(0).map(wrap360), 40)
  const vane = withRow(QUIET_VANE, -38)
  expect(flagged(frameOf({ nacelle_position: moved, vane }))).toEqual([])
  expect(flagged(frameOf({ nacelle_position: moved }))).toEqual([ROW])
})

test('several rows on end are found', () => {
  const spoilt = hunting(0)
    .map(wrap360)
    .map((angle, i) => [210, 96, 141, 318, 57][i - ROW] ?? angle)
  expect(flagged(frameOf({ nacelle_position: spoilt }))).toEqual([0, 1, 2, 3, 4].map((k) => ROW + k))
})

test('extremes that do not span the seam acquit, an SD of readings on both sides convicts', () => {
  const nacelle = withRow(hunting(0).map(wrap360), 90)
  const extremes = (min: number, max: number) => ({
    nacelle_position: nacelle,
    nacelle_position_min: withRow(nacelle, min),
    nacelle_position_max: withRow(nacelle, max),
  })
  expect(flagged(frameOf(extremes(80, 95)))).toEqual([])
  expect(flagged(frameOf(extremes(0.2, 359.8)))).toEqual([ROW])
  // Readings of 0 and 360 with mean 90: a quarter at 360, SD = 360 sqrt(1/4 x 3/4) = 155.9, by hand.
  const sd = withRow(new Float64Array(N).fill(2), 155.9)
  const alone = frameOf({
    nacelle_position: nacelle,
    nacelle_position_sd: sd,
    vane: withRow(QUIET_VANE, -88),
  })
  expect(flagged(alone)).toEqual([ROW])
})

test('a wind direction that was averaged is told from a nacelle that was', () => {
  const nacelle = hunting(0).map(wrap360)
  const wind = nacelle.map((angle, i) => wrap360(angle + QUIET_VANE[i]!))
  const badWind = frameOf({ nacelle_position: nacelle, wind_direction: withRow(wind, 150) })
  expect(badWind.averagedAcrossNorth).toEqual({ vane: 0, nacelle_position: 0, wind_direction: 1 })
  expect(badWind.indicatedDirection[ROW]).toBeCloseTo(wrap360(nacelle[ROW]! + QUIET_VANE[ROW]!), 9)
  const badNacelle = frameOf({ nacelle_position: withRow(nacelle, 150), wind_direction: wind })
  expect(badNacelle.averagedAcrossNorth).toEqual({ vane: 0, nacelle_position: 1, wind_direction: 0 })
})

test('a vane worked out from an averaged angle is no vane', () => {
  const nacelle = hunting(0).map(wrap360)
  const wind = nacelle.map((angle, i) => wrap360(angle + QUIET_VANE[i]!))
  const frame = frameOf({
    vane: new Float64Array(N).fill(NaN),
    nacelle_position: withRow(nacelle, 150),
    wind_direction: wind,
  })
  expect(flagged(frame)).toEqual([ROW])
  expect(frame.vane[ROW]).toBeNaN()
  expect(frame.running[ROW]).toBe(0)
})

/** Arithmetic mean and SD of one-minute vanes on a scale of 0 to 360, ten to a row. */
function arithmeticVane(): { vane: Float64Array; vane_sd: Float64Array } {
  const rows = Array.from({ length: N }, (_, i) =>
    Array.from({ length: 10 }, (_, k) => wrap360(4 * QUIET_VANE[i]! + 3 * Math.sin(i * 13.7 + k * 2.3))),
  )
  const mean = rows.map((row) => row.reduce((sum, angle) => sum + angle, 0) / 10)
  const sd = rows.map((row, i) =>
    Math.sqrt(row.reduce((sum, angle) => sum + (angle - mean[i]!) ** 2, 0) / 10),
  )
  return { vane: Float64Array.from(mean), vane_sd: Float64Array.from(sd) }
}

test('a vane of 0 to 360 with arithmetic means is used only where its SD acquits it', () => {
  const { vane, vane_sd } = arithmeticVane()
  const clean = [...vane.keys()].filter((i) => vane_sd[i]! < 15)
  expect(clean.length).toBeGreaterThan(20)
  expect(N - clean.length).toBeGreaterThan(20)
  const known = frameOf({ vane, vane_sd })
  expect([...known.vane.keys()].filter((i) => !Number.isNaN(known.vane[i]!))).toEqual(clean)
  // Without the SD no row can be trusted: one reading of 360 among ten near 4 gives 40, and one among 600 gives 4.6.
  expect(frameOf({ vane }).vane.every((angle) => Number.isNaN(angle))).toBe(true)
})

function farmFrame(farm: SimulatedFarm): readonly TurbineFrame[] {
  return buildFrame(
    farm.turbines.map((turbine) => ({
      turbine: turbine.turbine,
      time: turbine.timeMs,
      numbers: turbine.columns,
      texts: { status: turbine.status },
    })),
    { site: { runningStatus: ['run', 'limited'] }, settings: SETTINGS, intervalS: 600 },
  ).turbines
}

test.each(['wrapped', 'signed'] as const)(
  'on a %s simulated farm four in five bad rows are found and one good row in a thousand is not lost',
  (nacelleScale) => {
    const scenario = {
      seed: nacelleScale === 'wrapped' ? 5 : 3,
      turbines: 2,
      days: 14,
      nacelleScale,
    } as const
    const healthy = simulateFarm(scenario)
    const averaged = simulateFarm({ ...scenario, averageAcrossNorth: true })
    const good = farmFrame(healthy)
    const bad = farmFrame(averaged)
    let spoilt = 0
    let found = 0
    let falsely = 0
    good.forEach((frame, k) => {
      falsely += flagged(frame).length
      const truth = healthy.turbines[k]!.columns.nacelle_position
      const read = averaged.turbines[k]!.columns.nacelle_position
      for (let i = 0; i < truth.length; i++) {
        if (!(Math.abs(wrap180(read[i]! - truth[i]!)) > 20)) continue
        spoilt++
        if (bad[k]!.reason[i] === AVERAGED) found++
      }
    })
    expect(spoilt).toBeGreaterThan(20)
    expect(found / spoilt).toBeGreaterThan(0.8)
    expect(falsely).toBeLessThanOrEqual(4) // of 4032 rows
  },
)
