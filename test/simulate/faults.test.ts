import { describe, expect, test } from 'vitest'
import { wrap180 } from '../../src/kernel/angle/index.ts'
import {
  FAULT_KINDS,
  simulateFarm,
  truthDocument,
  emptyAccount,
  type Fault,
  type FaultKind,
  type FarmScenario,
  type RowColumn,
  type SimulatedTurbine,
} from '../../src/simulate/index.ts'

const HOUR_S = 3600
/** Every fault lasts from 06:00 to 18:00 of the first day. */
const FROM_S = 6 * HOUR_S
const TO_S = 18 * HOUR_S
/** One turbine, a day of one-second rows; all its weather is the same whatever goes wrong with its sensors. */
const BASE: Partial<FarmScenario> = {
  seed: 5,
  turbines: 1,
  days: 1,
  rateS: 1,
  stops: false,
  limits: false,
  offsetsDeg: [0],
  northOffsetsDeg: [0],
  nacelleScale: 'wound',
}

const known = new Map<string, SimulatedTurbine>()
/** The turbine with a fault; `null`: sound. */
function faulty(
  kind: FaultKind | null,
  numbers: Pick<Fault, 'size' | 'place'> = {},
  more: Partial<FarmScenario> = {},
) {
  const key = JSON.stringify([kind, numbers, more])
  const made = known.get(key)
  if (made) return made
  const faults = kind === null ? [] : [{ turbine: 0, kind, fromS: FROM_S, toS: TO_S, ...numbers }]
  const turbine = simulateFarm({ ...BASE, ...more, faults }).turbines[0]!
  known.set(key, turbine)
  return turbine
}
const during = (turbine: SimulatedTurbine, name: RowColumn) => turbine.columns[name].slice(FROM_S, TO_S)
const before = (turbine: SimulatedTurbine, name: RowColumn) => turbine.columns[name].slice(0, FROM_S)
const mean = (values: ArrayLike<number>) => Array.from(values).reduce((sum, x) => sum + x, 0) / values.length
const sd = (values: ArrayLike<number>) => {
  const centre = mean(values)
  return Math.sqrt(mean(Array.from(values, (x) => (x - centre) ** 2)))
}
/** Differences from second to second. */
const steps = (values: ArrayLike<number>) => Array.from(values, (x, i) => x - (values[i - 1] ?? x))
/** Moves of a wound heading: travel of each, signed, from runs of seconds in which it turns. */
function movesOf(heading: Float64Array): { travelDeg: number; seconds: number; startS: number }[] {
  const moves: { travelDeg: number; seconds: number; startS: number }[] = []
  let travelDeg = 0
  let seconds = 0
  for (const [i, step] of steps(heading).entries()) {
    if (Math.abs(step) > 1e-9) {
      travelDeg += step
      seconds++
    } else if (seconds > 0) {
      moves.push({ travelDeg, seconds, startS: i - seconds })
      travelDeg = seconds = 0
    }
  }
  return moves
}

test.each(FAULT_KINDS.filter((kind) => !kind.endsWith('-iced')))(
  '%s leaves everything before it as it was',
  (kind) => {
    const sound = faulty(null)
    const turbine = faulty(kind)
    for (const name of ['wind_speed', 'vane', 'power'] as const) {
      const same = before(turbine, name).every((value, i) => value === sound.columns[name][i])
      // The two that are built in from the start: a coarse disc, and cables that are twisted already.
      if (kind !== 'vane-stuck-bit' && kind !== 'yaw-no-untwist') expect(same, name).toBe(true)
    }
  },
)

describe('vane', () => {
  test('an iced vane keeps its value while the whole farm is near freezing, and only then', () => {
    const turbine = faulty('vane-iced')
    expect(new Set(during(turbine, 'vane')).size).toBe(1)
    expect(new Set(turbine.columns.vane.slice(TO_S)).size).toBeGreaterThan(1000)
    // Thermometers err by 0.3 degrees rms and a tenth of the weather's 6 degrees is left.
    for (const value of during(turbine, 'air_temperature')) expect(Math.abs(value + 1)).toBeLessThan(3)
    const late = turbine.columns.air_temperature.slice(-HOUR_S)
    expect(mean(late)).toBeCloseTo(mean(faulty(null).columns.air_temperature.slice(-HOUR_S)), 6)
  })

  test('a knocked vane changes its offset for as long, and the rotor turns away by as much', () => {
    const turbine = faulty('vane-knocked', { size: 9 })
    expect(turbine.truth.offsets.map(({ fromS, offsetDeg }) => [fromS, offsetDeg])).toEqual([
      [0, 0],
      [FROM_S, -9],
      [TO_S, 0],
    ])
    expect(mean(turbine.trueYawErrorDeg.slice(FROM_S, TO_S))).toBeCloseTo(-9, 0)
  })

  test('angles of a dead sector are never read, and those on both sides are', () => {
    const read = during(faulty('vane-dead-sector', { size: 6, place: 3 }), 'vane')
    expect(read.filter((v) => v > 0.01 && v < 5.99).length).toBe(0)
    expect(read.filter((v) => v > -3 && v < 0).length).toBeGreaterThan(1000)
    expect(read.filter((v) => v > 6 && v < 9).length).toBeGreaterThan(1000)
  })

  test('a stuck track leaves half of the codes', () => {
    const turbine = faulty('vane-stuck-bit', { size: 1, place: 1 })
    const codes = (values: Float64Array) =>
      new Set(Array.from(values, (v) => Math.round((((v % 360) + 360) % 360) / (360 / 256)) % 256))
    const gray = [...codes(during(turbine, 'vane'))].map((code) => code ^ (code >> 1))
    expect(gray.length).toBeGreaterThan(5)
    expect(gray.every((code) => (code & 2) === 2)).toBe(true)
    expect([...codes(before(turbine, 'vane'))].some((code) => ((code ^ (code >> 1)) & 2) === 0)).toBe(true)
  })

  test('a coarse vane reads multiples of its step', () => {
    const read = during(faulty('vane-coarse-step', { size: 11.25 }), 'vane')
    expect(read.every((v) => Math.abs(v / 11.25 - Math.round(v / 11.25)) < 1e-9)).toBe(true)
  })

  test('lost damping multiplies the noise from second to second', () => {
    const noise = (turbine: SimulatedTurbine) => sd(steps(during(turbine, 'vane')).map(wrap180))
    const [usual, much, little] = [null, 3, 0].map((size) =>
      noise(size === null ? faulty(null) : faulty('vane-noise', { size })),
    )
    // 3 degrees rms of white noise make 4.2 from second to second; the wind's own part comes on top.
    expect(much! / usual!).toBeGreaterThan(2)
    expect(much!).toBeGreaterThan(0.9 * 9 * Math.SQRT2)
    expect(little!).toBeLessThan(usual! * 0.8)
  })

  test('spikes come as often as was set', () => {
    const turbine = faulty('vane-spikes', { size: 60 })
    const far = during(turbine, 'vane').filter((v) => Math.abs(v) > 60).length
    // 720 in 12 hours, two thirds of them beyond 60 degrees: 480, and six standard deviations.
    expect(Math.abs(far - 480)).toBeLessThan(6 * 22)
  })

  test('a vane that nobody follows says nothing of the yaw error, which stays small', () => {
    const turbine = faulty('vane-not-followed')
    const vane = during(turbine, 'vane')
    const error = turbine.trueYawErrorDeg.slice(FROM_S, TO_S)
    const covariance = mean(vane.map((v, i) => v * error[i]!)) - mean(vane) * mean(error)
    expect(Math.abs(covariance / (sd(vane) * sd(error)))).toBeLessThan(0.1)
    expect(sd(error)).toBeCloseTo(sd(faulty(null).trueYawErrorDeg.slice(FROM_S, TO_S)), 5)
  })

  test('a bias of the idling vane turns the stopped nacelle away, and leaves the running one alone', () => {
    const turbine = faulty(
      'vane-idle-bias',
      { size: 20 },
      { stops: [{ turbine: 0, fromS: 10 * HOUR_S, toS: 14 * HOUR_S }], meanWindMs: 10 },
    )
    expect(mean(turbine.trueYawErrorDeg.slice(11 * HOUR_S, 14 * HOUR_S))).toBeLessThan(-10)
    expect(Math.abs(mean(turbine.trueYawErrorDeg.slice(FROM_S, 10 * HOUR_S)))).toBeLessThan(1)
    expect(Math.abs(mean(turbine.trueYawErrorDeg.slice(15 * HOUR_S, TO_S)))).toBeLessThan(1)
  })

  test('a reversed vane has the other sign in the log and nowhere else', () => {
    const [turbine, sound] = [faulty('vane-reversed'), faulty(null)]
    // Unit vectors of a table: 1e-6 degrees.
    const sums = during(turbine, 'vane').map((v, i) => v + sound.columns.vane[FROM_S + i]!)
    expect(Math.max(...sums.map(Math.abs))).toBeLessThan(1e-5)
    expect(turbine.trueYawErrorDeg).toEqual(sound.trueYawErrorDeg)
  })

  test('a second vane drifts away and leaves the first alone', () => {
    const turbine = faulty('second-vane-drift', { size: 12 })
    expect(turbine.columns.vane).toEqual(faulty(null).columns.vane)
    const gap = turbine.columns.vane_2.map((v, i) => wrap180(v - turbine.columns.vane[i]!))
    expect(mean(gap.slice(0, FROM_S))).toBeCloseTo(0, 0)
    expect(mean(gap.slice(TO_S - HOUR_S, TO_S))).toBeCloseTo((12 * 11.5) / 24, 0)
  })
})

describe('nacelle position', () => {
  const error = (turbine: SimulatedTurbine) => {
    const sound = faulty(null)
    return turbine.columns.nacelle_position.map((x, i) => x - sound.columns.nacelle_position[i]!)
  }

  test('a slip grows with time, missing pulses with clockwise travel', () => {
    const slipped = error(faulty('nacelle-drift', { size: 12 }))
    expect(slipped[TO_S - 10]).toBeCloseTo(6, 1)
    const missed = error(faulty('nacelle-missing-pulses', { size: 0.1 }))
    const clockwise = steps(faulty(null).columns.nacelle_position.slice(FROM_S - 1, TO_S))
      .filter((step) => step > 0)
      .reduce((sum, step) => sum + step, 0)
    expect(clockwise).toBeGreaterThan(50)
    expect(missed[TO_S - 1]).toBeCloseTo(-0.1 * clockwise, 6)
  })

  test('a zero that is lost after a stop stays lost until the next one, and the truth dates it', () => {
    const stops = [8, 12, 16].map((hour) => ({
      turbine: 0,
      fromS: hour * HOUR_S,
      toS: (hour + 1) * HOUR_S,
    }))
    const turbine = simulateFarm({
      ...BASE,
      stops,
      faults: [{ turbine: 0, kind: 'nacelle-zero-lost', fromS: FROM_S, toS: TO_S }],
    }).turbines[0]!
    const sound = simulateFarm({ ...BASE, stops }).turbines[0]!
    const errors = turbine.columns.nacelle_position.map((x, i) => x - sound.columns.nacelle_position[i]!)
    const found = steps(errors).flatMap((step, i) =>
      Math.abs(step) > 1e-6 ? [{ atS: i, stepDeg: step }] : [],
    )
    expect(found.length).toBeGreaterThanOrEqual(1)
    expect(found.map(({ atS }) => atS)).toEqual(turbine.truth.nacelleSteps.map(({ atS }) => atS))
    for (const [i, { stepDeg }] of found.entries())
      expect(stepDeg).toBeCloseTo(turbine.truth.nacelleSteps[i]!.stepDeg, 6)
  })

  test('jumps come back, and the truth dates them', () => {
    const turbine = faulty('nacelle-jumps', { size: 40, place: 20 })
    const errors = error(turbine).slice(0, TO_S)
    const sizes = steps(errors).filter((step) => Math.abs(step) > 1e-6)
    expect(sizes.length).toBeGreaterThan(5)
    expect(sizes.every((step) => Math.abs(Math.abs(step) - 40) < 1e-6)).toBe(true)
    expect(turbine.truth.nacelleSteps.length).toBeGreaterThanOrEqual(sizes.length)
    expect(mean(errors.map((x) => (Math.abs(x) < 1e-6 ? 1 : 0)))).toBeGreaterThan(0.5)
  })

  test('a stuck reading stands still, a coarse one has steps, a reversed one falls', () => {
    expect(new Set(during(faulty('nacelle-stuck'), 'nacelle_position')).size).toBe(1)
    const coarse = during(faulty('nacelle-coarse-step', { size: 15 }), 'nacelle_position')
    expect(coarse.every((x) => Math.abs(x / 15 - Math.round(x / 15)) < 1e-9)).toBe(true)
    const reversed = during(faulty('nacelle-reversed'), 'nacelle_position')
    const sound = during(faulty(null), 'nacelle_position')
    expect(reversed.every((x, i) => x === -sound[i]!)).toBe(true)
  })

  test('means across north err only where the logger takes them of wrapped readings', () => {
    const given = { rateS: 600, nacelleScale: 'wrapped', days: 10, turningDegPerHour: 30 } as const
    const whole = { fromS: 0, toS: 10 * 86400 }
    const sound = simulateFarm({ ...BASE, ...given }).turbines[0]!
    const turbine = simulateFarm({
      ...BASE,
      ...given,
      faults: [{ turbine: 0, kind: 'nacelle-across-north', ...whole }],
    }).turbines[0]!
    const gaps = turbine.columns.nacelle_position.map((x, i) =>
      wrap180(x - sound.columns.nacelle_position[i]!),
    )
    const wrong = gaps.filter((gap) => Math.abs(gap) > 5).length
    expect(wrong).toBeGreaterThan(0)
    expect(wrong).toBeLessThan(gaps.length / 10)
  })
})

describe('anemometer', () => {
  const ratio = (turbine: SimulatedTurbine) => {
    const sound = faulty(null)
    return turbine.columns.wind_speed.map((x, i) => x / sound.columns.wind_speed[i]!)
  }

  test('its gain drifts by so much a day', () => {
    const ratios = ratio(faulty('anemometer-drift', { size: -0.1 }))
    expect(ratios[TO_S - 1]).toBeCloseTo(0.95, 3)
    expect(ratios[TO_S + 10]).toBe(1)
  })

  test('a stuck one stands still, an iced one reads low in the cold', () => {
    expect(new Set(during(faulty('anemometer-stuck'), 'wind_speed')).size).toBe(1)
    const iced = faulty('anemometer-iced', { size: 0.6 })
    const ratios = Array.from(
      during(iced, 'wind_speed').slice(2 * HOUR_S),
      (x, i) => x / faulty(null).columns.wind_speed[FROM_S + 2 * HOUR_S + i]!,
    )
    expect(mean(ratios)).toBeGreaterThan(0.55)
    expect(mean(ratios)).toBeLessThan(0.65)
    expect(Math.abs(mean(during(iced, 'air_temperature')) + 1)).toBeLessThan(3)
  })
})

describe('yaw drive and controller', () => {
  const moves = (kind: FaultKind | null, numbers: Pick<Fault, 'size' | 'place'> = {}) =>
    movesOf(during(faulty(kind, numbers, { days: 1 }), 'nacelle_position'))

  test('a slow drive turns at the rate that was set', () => {
    const rates = moves('yaw-slow', { size: 0.5 }).map(({ travelDeg, seconds }) =>
      Math.abs(travelDeg / seconds),
    )
    expect(rates.length).toBeGreaterThan(10)
    for (const rate of rates) expect(rate).toBeCloseTo(0.2, 9)
  })

  test('a controller that hunts makes many times the moves, most of them reversals', () => {
    const hunting = moves('yaw-hunting')
    expect(hunting.length).toBeGreaterThan(5 * moves(null).length)
    const reversed = hunting.filter(
      ({ travelDeg, startS }, i) =>
        i > 0 && travelDeg * hunting[i - 1]!.travelDeg < 0 && startS - hunting[i - 1]!.startS < 300,
    )
    expect(reversed.length).toBeGreaterThan(0.3 * hunting.length)
  })

  test('an overshooting nacelle leaves the vane on the other side', () => {
    const turbine = faulty('yaw-overshoot', { size: 6 })
    const vane = during(turbine, 'vane')
    const after = moves('yaw-overshoot', { size: 6 }).map(
      ({ travelDeg, seconds, startS }) =>
        Math.sign(travelDeg) * mean(vane.slice(startS + seconds, startS + seconds + 20)),
    )
    const sound = during(faulty(null), 'vane')
    const usual = moves(null).map(
      ({ travelDeg, seconds, startS }) =>
        Math.sign(travelDeg) * mean(sound.slice(startS + seconds, startS + seconds + 20)),
    )
    expect(mean(usual) - mean(after)).toBeGreaterThan(4)
    expect(mean(usual) - mean(after)).toBeLessThan(8)
  })

  test('a wide threshold makes fewer and longer moves, an uneven one longer moves on one side', () => {
    const size = (list: { travelDeg: number }[]) => mean(list.map(({ travelDeg }) => Math.abs(travelDeg)))
    const wide = moves('yaw-wide-threshold', { size: 2 })
    expect(wide.length).toBeLessThan(0.6 * moves(null).length)
    expect(size(wide)).toBeGreaterThan(1.4 * size(moves(null)))
    const uneven = moves('yaw-unbalanced', { size: 2 })
    const counter = uneven.filter(({ travelDeg }) => travelDeg < 0)
    const clockwise = uneven.filter(({ travelDeg }) => travelDeg > 0)
    expect(size(counter)).toBeGreaterThan(1.4 * size(clockwise))
  })

  test('deliberate yaw holds the vane off zero in its sector', () => {
    const given = { turningDegPerHour: 30, rateS: 600, days: 20 } as const
    const turbine = simulateFarm({
      ...BASE,
      ...given,
      faults: [{ turbine: 0, kind: 'yaw-deliberate', fromS: 0, toS: 20 * 86400, size: 12, place: 200 }],
    }).turbines[0]!
    const vane = (inside: boolean) =>
      [...turbine.status.keys()]
        .filter((i) => {
          const away = Math.abs(wrap180(turbine.columns.nacelle_position[i]! - 200))
          return turbine.status[i] === 'run' && (inside ? away < 20 : away > 40)
        })
        .map((i) => turbine.columns.vane[i]!)
    expect(vane(true).length).toBeGreaterThan(20)
    expect(mean(vane(true))).toBeGreaterThan(9)
    expect(Math.abs(mean(vane(false)))).toBeLessThan(1)
  })

  test('cables that are never untwisted wind up beyond what the others allow', () => {
    const given = { turningDegPerHour: 60, rateS: 600, days: 12, seed: 2 } as const
    const twisted = (faults: Fault[]) => {
      const { status, columns } = simulateFarm({ ...BASE, ...given, faults }).turbines[0]!
      return {
        untwists: status.filter((one) => one === 'untwist').length,
        furthestDeg: Math.max(...columns.nacelle_position.map(Math.abs)),
      }
    }
    const sound = twisted([])
    const wound = twisted([{ turbine: 0, kind: 'yaw-no-untwist', fromS: 0, toS: 12 * 86400 }])
    expect(wound.untwists).toBe(0)
    expect(sound.furthestDeg).toBeLessThan(960)
    expect(wound.furthestDeg).toBeGreaterThan(960)
  })
})

describe('corrections', () => {
  const DAY_S = 86400
  const corrected = (addedDeg: number, vaneLogged: FarmScenario['vaneLogged']) =>
    simulateFarm({
      ...BASE,
      days: 8,
      rateS: 600,
      offsetsDeg: [6],
      vaneLogged,
      corrections: [{ turbine: 0, atS: 4 * DAY_S, recordedDeg: 6, addedDeg }],
    }).turbines[0]!

  test.each([
    ['with the right sign', 6, 0],
    ['with the wrong sign', -6, 12],
    ['recorded but not entered', 0, 6],
  ])('%s the rotor stands where the truth says', (_, addedDeg, standingDeg) => {
    for (const vaneLogged of ['beforeCorrection', 'afterCorrection'] as const) {
      const turbine = corrected(addedDeg, vaneLogged)
      expect(turbine.truth.offsets.at(-1)).toEqual({
        fromS: 4 * DAY_S,
        // The vane before correction has the offset that it had; what the controller adds does not show in it.
        offsetDeg: vaneLogged === 'beforeCorrection' ? 6 : standingDeg,
        standingDeg,
      })
      expect(turbine.truth.corrections).toEqual([{ atS: 4 * DAY_S, recordedDeg: 6, addedDeg }])
      const half = turbine.trueYawErrorDeg.length / 2
      expect(mean(turbine.trueYawErrorDeg.slice(half))).toBeCloseTo(standingDeg, 0)
      const running = [...turbine.status.keys()].filter((i) => i >= half && turbine.status[i] === 'run')
      const vane = mean(running.map((i) => turbine.columns.vane[i]!))
      expect(Math.abs(vane - (vaneLogged === 'beforeCorrection' ? -addedDeg : 0))).toBeLessThan(1)
    }
  })
})

test('the truth tells each fault with its turbine, kind, start, end and numbers', () => {
  const farm = simulateFarm({
    turbines: 2,
    days: 2,
    faults: [
      { turbine: 1, kind: 'nacelle-shift', fromS: 3 * HOUR_S, toS: 90 * HOUR_S, size: 24 },
      { turbine: 0, kind: 'vane-frozen', fromS: HOUR_S, toS: 2 * HOUR_S },
    ],
    corrections: [{ turbine: 0, atS: HOUR_S, recordedDeg: 3, addedDeg: -3 }],
  })
  const { faults, corrections } = truthDocument(farm, emptyAccount())
  expect(faults).toMatchObject([
    {
      turbine: 'Q01',
      sensor: 'vane',
      kind: 'vane-frozen',
      from: '2026-03-01T01:00:00.000Z',
      to: '2026-03-01T02:00:00.000Z',
      size: null,
      place: null,
    },
    {
      turbine: 'Q02',
      sensor: 'nacelle-position',
      kind: 'nacelle-shift',
      from: '2026-03-01T03:00:00.000Z',
      to: '2026-03-03T00:00:00.000Z',
      size: 24,
    },
  ])
  expect(corrections).toEqual([
    { turbine: 'Q01', at: '2026-03-01T01:00:00.000Z', recordedDeg: 3, addedDeg: -3 },
  ])
})

test('faults that make no sense are refused by their name', () => {
  const refused = (fault: Fault, text: string) => {
    expect(() => simulateFarm({ turbines: 1, days: 1, faults: [fault] })).toThrow(
      expect.objectContaining({
        code: 'OUT_OF_RANGE',
        message: expect.stringContaining(text) as string,
      }),
    )
  }
  const spell = { turbine: 0, fromS: 0, toS: 10 }
  refused({ ...spell, kind: 'anemometer-gain', size: NaN }, 'anemometer-gain, size')
  refused({ ...spell, kind: 'vane-dead-sector', place: 400 }, 'vane-dead-sector, place')
  refused({ ...spell, kind: 'vane-frozen', toS: 0 }, 'an end after its start')
  refused({ ...spell, kind: 'melted' as FaultKind }, 'expected one of vane-frozen')
})
