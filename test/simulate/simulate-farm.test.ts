import { beforeAll, describe, expect, test } from 'vitest'
import { circularMean, wrap180 } from '../../src/kernel/angle/index.ts'
import {
  randomScenario,
  simulateFarm,
  type FarmScenario,
  type SimulatedTurbine,
} from '../../src/simulate/index.ts'

const mean = (values: number[]) => values.reduce((sum, x) => sum + x, 0) / values.length
const sd = (values: number[]) => {
  const centre = mean(values)
  return Math.sqrt(mean(values.map((x) => (x - centre) ** 2)))
}
/** Rows in which the turbine runs freely for all of the interval, below 90 % of rated power. */
const freeRows = (turbine: SimulatedTurbine, ratedKw = 2300) =>
  [...turbine.status.keys()].filter(
    (i) =>
      turbine.status[i] === 'run' &&
      turbine.columns.power[i]! > 50 &&
      turbine.columns.power[i]! < 0.9 * ratedKw,
  )
const short: Partial<FarmScenario> = { seed: 5, turbines: 2, days: 1 }

describe('a month of three turbines', () => {
  let turbines: SimulatedTurbine[]
  beforeAll(() => {
    turbines = simulateFarm({ seed: 4, turbines: 3, days: 30, offsetsDeg: [0, 6, -8] }).turbines
  })

  test('the controller nulls the vane, so the true yaw error is the offset', () => {
    for (const { truth } of turbines) {
      // The 1 s yaw error has an SD below 7 degrees and, at one yaw move in 20 min, some 1500 independent values: a standard error below 0.2.
      expect(Math.abs(truth.yawErrorMeanDeg - truth.offsetDeg), truth.turbine).toBeLessThan(0.6)
      expect(Math.abs(truth.vaneMeanDeg), truth.turbine).toBeLessThan(0.6)
      expect(truth.yawErrorMeanDeg - truth.vaneMeanDeg).toBeCloseTo(truth.offsetDeg, 0)
      expect(truth.standingDeg).toBe(truth.offsetDeg)
    }
  })

  test('ten-minute vanes scatter as those of real farms do', () => {
    for (const turbine of turbines) {
      const vanes = freeRows(turbine).map((i) => turbine.columns.vane[i]!)
      // 3.26 degrees were seen on real turbines.
      expect(sd(vanes)).toBeGreaterThan(2.5)
      expect(sd(vanes)).toBeLessThan(5)
    }
  })

  test('energy lost to the offset is what the cosine law takes, less where rated power caps it', () => {
    const [aligned, , far] = turbines.map((turbine) => turbine.truth)
    expect(Math.abs(aligned!.lostStaticMwh / aligned!.clearMwh)).toBeLessThan(0.001)
    const share = far!.lostStaticMwh / (far!.clearMwh + far!.lostStaticMwh)
    const full = 1 - Math.cos((8 * Math.PI) / 180) ** 3
    expect(share).toBeGreaterThan(0.3 * full)
    expect(share).toBeLessThan(1.3 * full) // steeper than a cube near cut-in
    for (const { truth } of turbines) {
      expect(truth.lostDynamicMwh).toBeGreaterThan(0)
      expect(truth.clearMwh).toBeLessThanOrEqual(truth.producedMwh * 1.02)
      expect(truth.clearHours).toBeLessThan(720)
      expect(truth.belowRatedHours).toBeLessThanOrEqual(truth.clearHours)
    }
  })

  test('at equal rotor wind a misaligned turbine makes less, by the steepness of its curve', () => {
    const speedAndPower = (turbine: SimulatedTurbine) =>
      freeRows(turbine)
        .filter((i) => turbine.trueRotorWindMs[i]! > 7 && turbine.trueRotorWindMs[i]! < 9)
        .map((i) => Math.log(turbine.columns.power[i]!) - 3.3 * Math.log(turbine.trueRotorWindMs[i]!))
    const gap = mean(speedAndPower(turbines[0]!)) - mean(speedAndPower(turbines[2]!))
    // Steepness 3.3 near 8 m/s: 3.3 (1 - cos 8 degrees) = 0.032; the two turbines' drift of 1 % each leaves about 0.01.
    expect(gap).toBeGreaterThan(0.015)
    expect(gap).toBeLessThan(0.055)
  })

  test('the wind has the mean that was asked for within what a month leaves open', () => {
    for (const turbine of turbines) {
      const speed = mean([...turbine.columns.wind_speed])
      expect(speed).toBeGreaterThan(7.2 * 0.7)
      expect(speed).toBeLessThan(7.2 * 1.3)
      const free = freeRows(turbine)
      const intensity = mean(
        free.map((i) => turbine.columns.wind_speed_sd[i]! / turbine.columns.wind_speed[i]!),
      )
      expect(intensity).toBeGreaterThan(0.07)
      expect(intensity).toBeLessThan(0.16)
    }
  })

  test('power at a given anemometer speed scatters by 6 to 12 percent from row to row', () => {
    const turbine = turbines[0]!
    const groups = new Map<number, number[]>()
    for (const i of freeRows(turbine)) {
      const bin = Math.floor(turbine.columns.wind_speed[i]! * 10)
      if (bin >= 60 && bin < 90)
        groups.set(bin, [...(groups.get(bin) ?? []), Math.log(turbine.columns.power[i]!)])
    }
    const residuals = [...groups.values()].flatMap((group) => group.map((x) => x - mean(group)))
    expect(sd(residuals)).toBeGreaterThan(0.06)
    expect(sd(residuals)).toBeLessThan(0.12)
  })

  test('nacelle reading plus vane plus offset less north offset is where the wind comes from, on every turbine', () => {
    const count = turbines[0]!.timeMs.length
    const gaps: number[] = []
    for (let i = 0; i < count; i++) {
      if (turbines.some((turbine) => turbine.status[i] !== 'run')) continue
      const [a, b] = turbines.map(
        ({ columns, truth }) =>
          columns.nacelle_position[i]! + columns.vane[i]! + truth.offsetDeg - truth.northOffsetDeg,
      )
      gaps.push(wrap180(a! - b!))
    }
    expect(gaps.length).toBeGreaterThan(1000)
    // Local direction differences of some 3 degrees with a time scale of an hour: 500 hours leave 0.2.
    expect(Math.abs(mean(gaps))).toBeLessThan(0.8)
    expect(sd(gaps)).toBeLessThan(8)
  })

  test('stopped turbines make nothing, feather their blades and still log a vane', () => {
    const turbine = turbines.find(({ status }) => status.filter((x) => x === 'stop').length > 30)!
    // The second half of a stop of at least two rows: the rotor has run down.
    const stopped = [...turbine.status.keys()].filter(
      (i) =>
        turbine.status[i] === 'stop' &&
        turbine.status[i - 1] === 'stop' &&
        turbine.status[i - 2] === 'stop' &&
        turbine.status[i + 1] === 'stop',
    )
    expect(stopped.length).toBeGreaterThan(10)
    for (const i of stopped) {
      expect(turbine.columns.power[i]!).toBeLessThan(0)
      expect(turbine.columns.pitch[i]!).toBeGreaterThan(80)
      expect(turbine.columns.vane[i]!).not.toBeNaN()
    }
  })

  test('limited turbines stay below their set-point with pitched blades', () => {
    const rows = turbines.flatMap(({ status, columns }) =>
      [...status.keys()]
        .filter((i) => status[i] === 'limited' && columns.power_limit[i]! < 2000)
        .map((i) => ({
          power: columns.power[i]!,
          limit: columns.power_limit[i]!,
          pitch: columns.pitch[i]!,
        })),
    )
    expect(rows.length).toBeGreaterThan(10)
    // A row in which the limit begins or ends holds freer minutes, but its mean limit holds them too.
    expect(rows.every(({ power, limit }) => power < limit * 1.15)).toBe(true)
    const held = rows.filter(({ power, limit }) => power > 0.97 * limit)
    expect(mean(held.map(({ pitch }) => pitch))).toBeGreaterThan(1)
  })
})

test('the same scenario gives the same numbers and another seed gives others', () => {
  const first = simulateFarm(short),
    again = simulateFarm(short)
  expect(again).toEqual(first)
  const other = simulateFarm({ ...short, seed: 6 })
  expect(other.turbines[0]!.columns.power).not.toEqual(first.turbines[0]!.columns.power)
})

test('a further turbine leaves the others as they were', () => {
  const two = simulateFarm({ ...short, wakes: false }),
    three = simulateFarm({ ...short, wakes: false, turbines: 3 })
  expect(three.turbines.slice(0, 2)).toEqual(two.turbines)
})

test('a longer window begins like a shorter one', () => {
  const day = simulateFarm(short),
    two = simulateFarm({ ...short, days: 2 })
  for (const [index, turbine] of day.turbines.entries()) {
    const longer = two.turbines[index]!
    expect(longer.columns.power.slice(0, 144)).toEqual(turbine.columns.power)
    expect(longer.columns.nacelle_position.slice(0, 144)).toEqual(turbine.columns.nacelle_position)
  }
})

test('rows of one second carry the same energy as rows of ten minutes', () => {
  const fine = simulateFarm({ ...short, turbines: 1, rateS: 1 }).turbines[0]!
  const coarse = simulateFarm({ ...short, turbines: 1 }).turbines[0]!
  expect(fine.timeMs.length).toBe(86400)
  expect(mean([...fine.columns.power])).toBeCloseTo(mean([...coarse.columns.power]), 8)
  expect(fine.truth).toEqual(coarse.truth)
  const firstRow = [...fine.columns.vane.slice(0, 600)]
  expect(wrap180(circularMean(firstRow).direction)).toBeCloseTo(coarse.columns.vane[0]!, 4)
})

test('an anemometer that answers to the vane reads more on one side, by as much as was set', () => {
  const base: Partial<FarmScenario> = { seed: 9, turbines: 1, days: 20, offsetsDeg: [0], wakes: false }
  const slope = (responsePerDeg: number) => {
    const turbine = simulateFarm({ ...base, anemometerResponsePerDeg: responsePerDeg }).turbines[0]!
    const rows = freeRows(turbine)
    const x = rows.map((i) => turbine.columns.vane[i]!)
    const y = rows.map((i) => Math.log(turbine.columns.wind_speed[i]! / turbine.trueRotorWindMs[i]!))
    const xm = mean(x),
      ym = mean(y)
    return mean(x.map((v, i) => (v - xm) * (y[i]! - ym))) / sd(x) ** 2
  }
  // Same seed, same weather: the difference of the slopes has no sampling error but for the slow vane noise that the flow
  // does not feel, 0.6 of 3 degrees rms: 4 % of the slope.
  expect(slope(-0.003) - slope(0)).toBeCloseTo(-0.003 * 0.97, 4)
})

test('an anemometer may read less on either side, or ever more towards one', () => {
  const base: Partial<FarmScenario> = {
    ...{ seed: 9, turbines: 1, days: 1, rateS: 1, offsetsDeg: [0] },
    ...{ vaneNoiseDeg: 0, vaneSlowNoiseDeg: 0, anemometerNoiseMs: 0 },
  }
  const straight = simulateFarm(base).turbines[0]!
  const terms = { anemometerResponseSquarePerDeg2: -1e-4, anemometerResponseCubePerDeg3: 1e-5 }
  const bent = simulateFarm({ ...base, ...terms }).turbines[0]!
  // Without noise the vane is what the anemometer answers to, and the reading is a product; angles carry rounding of 360 turns.
  for (const row of [100, 1000, 2000]) {
    const vane = straight.columns.vane[row]!
    const ratio = bent.columns.wind_speed[row]! / straight.columns.wind_speed[row]!
    expect(Math.abs(vane), `row ${row}`).toBeGreaterThan(0.01)
    expect(ratio, `row ${row}`).toBeCloseTo(1 - 1e-4 * vane ** 2 + 1e-5 * vane ** 3, 9)
  }
})

test('a vane before correction differs from the one after it by the correction', () => {
  const corrected: Partial<FarmScenario> = { ...short, offsetsDeg: [2, -1], correctionsDeg: [5, 0] }
  const after = simulateFarm(corrected).turbines[0]!
  const before = simulateFarm({ ...corrected, vaneLogged: 'beforeCorrection' }).turbines[0]!
  for (const i of freeRows(after)) {
    expect(wrap180(after.columns.vane[i]! - before.columns.vane[i]!)).toBeCloseTo(5, 3)
  }
  expect(after.truth.offsetDeg).toBe(2)
  expect(before.truth.offsetDeg).toBe(7)
  expect(before.truth.standingDeg).toBe(2)
  expect(before.truth.yawErrorMeanDeg).toBe(after.truth.yawErrorMeanDeg)
})

test('a correction that was entered moves the true yaw error and leaves the mean vane at zero', () => {
  const turbine = simulateFarm({
    seed: 3,
    turbines: 1,
    days: 20,
    offsetsDeg: [7],
    offsetChanges: [{ turbine: 0, atS: 10 * 86400, toDeg: 1, entered: true }],
  }).turbines[0]!
  const rows = freeRows(turbine)
  const part = (first: boolean) => rows.filter((i) => i < 1440 === first)
  for (const [first, offset] of [
    [true, 7],
    [false, 1],
  ] as const) {
    expect(Math.abs(mean(part(first).map((i) => turbine.trueYawErrorDeg[i]!)) - offset)).toBeLessThan(1)
    expect(Math.abs(mean(part(first).map((i) => turbine.columns.vane[i]!)))).toBeLessThan(1)
  }
  expect(turbine.truth.offsets).toEqual([
    { fromS: 0, offsetDeg: 7, standingDeg: 7 },
    { fromS: 864000, offsetDeg: 1, standingDeg: 1 },
  ])
})

test('a vane of gain k lets the rotor stand off by d / k', () => {
  const { truth } = simulateFarm({ seed: 2, turbines: 1, days: 10, offsetsDeg: [6], vaneGain: 1.5 })
    .turbines[0]!
  expect(truth.standingDeg).toBe(4)
  expect(Math.abs(truth.yawErrorMeanDeg - 4)).toBeLessThan(0.8)
})

test('local speed and local direction are linked when they are told to be', () => {
  const linked = (linkCorrelation: number) => {
    const [a, b] = simulateFarm({
      seed: 8,
      turbines: 2,
      days: 10,
      wakes: false,
      stops: false,
      limits: false,
      linkCorrelation,
      offsetsDeg: [0, 0],
      northOffsetsDeg: [0, 0],
    }).turbines as [SimulatedTurbine, SimulatedTurbine]
    const x: number[] = [],
      y: number[] = []
    for (let i = 0; i < a.timeMs.length; i++) {
      if (a.status[i] !== 'run' || b.status[i] !== 'run') continue
      x.push(Math.log(a.trueRotorWindMs[i]! / b.trueRotorWindMs[i]!))
      const direction = (t: SimulatedTurbine) => t.columns.nacelle_position[i]! + t.trueYawErrorDeg[i]!
      y.push(wrap180(direction(a) - direction(b)))
    }
    const xm = mean(x),
      ym = mean(y)
    return mean(x.map((v, i) => (v - xm) * (y[i]! - ym))) / (sd(x) * sd(y))
  }
  // Farm-wide changes that arrive at different times dilute the link.
  expect(linked(0.8)).toBeGreaterThan(0.3)
  expect(linked(-0.8)).toBeLessThan(-0.3)
  expect(Math.abs(linked(0))).toBeLessThan(0.2)
})

test('sensor faults show in their spell and nowhere else', () => {
  const clean = simulateFarm(short).turbines[0]!
  const fault = (kind: 'vane-frozen' | 'nacelle-shift' | 'anemometer-gain', size: number) =>
    simulateFarm({ ...short, faults: [{ turbine: 0, fromS: 36000, toS: 72000, kind, size }] }).turbines[0]!
  const shifted = fault('nacelle-shift', 30),
    slow = fault('anemometer-gain', 0.9),
    frozen = fault('vane-frozen', 0)
  for (let i = 0; i < 144; i++) {
    const inside = i >= 60 && i < 120
    const turn = wrap180(shifted.columns.nacelle_position[i]! - clean.columns.nacelle_position[i]!)
    expect(turn).toBeCloseTo(inside ? 30 : 0, 6)
    if (i < 60) expect(slow.columns.wind_speed[i]).toBe(clean.columns.wind_speed[i])
    if (inside) {
      expect(frozen.columns.vane_sd[i]).toBeLessThan(0.01)
      expect(slow.columns.wind_speed[i]! / clean.columns.wind_speed[i]!).toBeCloseTo(0.9, 9)
    }
  }
})

test('a reference sees the true yaw error, and only where one is mounted', () => {
  const [with_, without] = simulateFarm({ ...short, references: [0] }).turbines as [
    SimulatedTurbine,
    SimulatedTurbine,
  ]
  const gaps = [...with_.columns.reference_yaw_error].map((x, i) => x - with_.trueYawErrorDeg[i]!)
  expect(Math.abs(mean(gaps))).toBeLessThan(0.15) // 0.3 / sqrt(144), six of it
  expect(without.columns.reference_yaw_error.every(Number.isNaN)).toBe(true)
})

test('farms drawn at random differ, obey overrides and run', () => {
  const farms = [1, 2, 3].map((seed) => randomScenario(seed, { turbines: 1, days: 2, exponent: 2 }))
  expect(new Set(farms.map((farm) => farm.yawThresholdDeg)).size).toBe(3)
  for (const farm of farms) {
    expect(farm.exponent).toBe(2)
    const { columns } = simulateFarm(farm).turbines[0]!
    expect([...columns.power, ...columns.vane, ...columns.wind_speed].every(Number.isFinite)).toBe(true)
  }
  expect(randomScenario(2)).toEqual(randomScenario(2))
})

test('scenarios that make no sense are refused by name', () => {
  const refused = (given: Partial<FarmScenario>, code: string, text: string) => {
    expect(() => simulateFarm(given)).toThrow(
      expect.objectContaining({ code, message: expect.stringContaining(text) as string }),
    )
  }
  refused({ turbines: 0 }, 'OUT_OF_RANGE', 'turbines')
  refused({ days: NaN }, 'OUT_OF_RANGE', 'days')
  refused({ days: 1.0001 }, 'OUT_OF_RANGE', 'days')
  refused({ rateS: 7 }, 'OUT_OF_RANGE', 'rateS')
  refused({ seed: 1.5 }, 'OUT_OF_RANGE', 'seed')
  refused({ linkCorrelation: 2 }, 'OUT_OF_RANGE', 'linkCorrelation')
  refused({ site: '../elsewhere' }, 'OUT_OF_RANGE', 'site')
  refused({ turbines: 2, offsetsDeg: [1, NaN] }, 'OUT_OF_RANGE', 'offsetsDeg')
  refused({ turbines: 2, references: [2] }, 'OUT_OF_RANGE', 'index of 0 to 1')
  refused({ turbines: 2, offsetsDeg: [1] }, 'LENGTH_MISMATCH', 'offsetsDeg')
})
