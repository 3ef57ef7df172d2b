import { beforeAll, expect, test } from 'vitest'
import { buildFrame, countReasons, type Frame, type TurbineColumns } from '../../src/frame/index.ts'
import { simulateFarm } from '../../src/simulate/index.ts'
import { SETTINGS } from './settings.ts'

const RUNNING = ['run', 'limited']
let farm: TurbineColumns[]
beforeAll(() => {
  farm = simulateFarm({ seed: 21, turbines: 4, days: 20, meanWindMs: 8 }).turbines.map((one) => ({
    turbine: one.turbine,
    time: one.timeMs,
    // As a logger writes it.
    numbers: { ...one.columns, vane: one.columns.vane.map((value) => Math.round(10 * value) / 10) },
    texts: { status: one.status },
  }))
})

function frameOf(columns: readonly TurbineColumns[]): Frame {
  return buildFrame(columns, { site: { runningStatus: RUNNING }, settings: SETTINGS, intervalS: 600 })
}

/** The farm with channels of its first turbine changed. */
function changed(
  change: (numbers: Record<string, Float64Array>) => Record<string, Float64Array>,
): TurbineColumns[] {
  return farm.map((one, i) =>
    i === 0 ? { ...one, numbers: { ...one.numbers, ...change({ ...one.numbers }) } } : one,
  )
}

function held(values: Float64Array, from: number, to: number, value = values[from]!): Float64Array {
  return values.map((own, i) => (i >= from && i < to ? value : own))
}

/** First row from which so many rows have wind to move a vane. */
function windyFrom(rows: number, after: number): number {
  const { wind_speed: wind } = farm[0]!.numbers
  let run = 0
  for (let i = after; i < wind!.length; i++) {
    run = wind![i]! > 4 ? run + 1 : 0
    if (run === rows) return i - rows + 1
  }
  throw new Error('no such wind in this farm')
}

test('a healthy farm has no still spells and no ice', () => {
  for (const { spells, turbine } of frameOf(farm).turbines) {
    expect(spells, turbine).toEqual({ vaneFrozen: [], anemometerStuck: [], anemometerIced: [] })
  }
})

test('two frozen spells of a vane are found to the row, set aside, and read as no vane', () => {
  const starts = [windyFrom(30, 300), windyFrom(12, 1500)]
  const ends = [starts[0]! + 30, starts[1]! + 12]
  const frozen = changed(({ vane, vane_sd }) => ({
    vane: held(held(vane!, starts[0]!, ends[0]!), starts[1]!, ends[1]!),
    vane_sd: held(held(vane_sd!, starts[0]!, ends[0]!, 0), starts[1]!, ends[1]!, 0),
  }))
  const turbine = frameOf(frozen).turbines[0]!
  expect(turbine.spells.vaneFrozen.map(({ fromMs, toMs, rows }) => [fromMs, toMs, rows])).toEqual(
    starts.map((start, k) => [turbine.time[start]!, turbine.time[ends[k]!]!, ends[k]! - start]),
  )
  for (let i = starts[0]!; i < ends[0]!; i++) {
    expect(turbine.vane[i]).toBeNaN()
    expect(turbine.running[i]).toBe(0)
  }
  expect(turbine.vaneRead[starts[0]!]).toBeCloseTo(frozen[0]!.numbers['vane']![starts[0]!]!, 9)
  expect(countReasons(turbine.reason)['sensor-fault']).toBeGreaterThan(20)
})

test('a frozen vane is found by its value alone where no SD is logged', () => {
  const start = windyFrom(18, 700)
  const turbine = frameOf(
    changed(({ vane, vane_sd }) => ({
      vane: held(vane!, start, start + 18),
      vane_sd: vane_sd!.map(() => NaN),
    })),
  ).turbines[0]!
  expect(turbine.spells.vaneFrozen).toHaveLength(1)
  expect(turbine.spells.vaneFrozen[0]!.rows).toBe(18)
})

test('a vane with a step of ten degrees rests on its codes for hours and is not frozen', () => {
  const coarse = changed(({ vane, vane_sd }) => ({
    vane: vane!.map((value) => 10 * Math.round(value / 10)),
    vane_sd: vane_sd!.map(() => NaN),
  }))
  expect(frameOf(coarse).turbines[0]!.spells.vaneFrozen).toEqual([])
})

test('a record that was held is told from a vane that was', () => {
  const start = windyFrom(24, 900)
  const hold = (values: Float64Array) => held(values, start, start + 24)
  const turbine = frameOf(
    changed(({ vane, wind_speed, power }) => ({
      vane: hold(vane!),
      wind_speed: hold(wind_speed!),
      power: hold(power!),
    })),
  ).turbines[0]!
  expect(turbine.spells.vaneFrozen[0]?.recordHeld).toBe(true)
})

test('the nacelle position plays no part in it', () => {
  const start = windyFrom(18, 700)
  const frozen = changed(({ vane }) => ({ vane: held(vane!, start, start + 18) }))
  const noisy = frozen.map((one) => ({
    ...one,
    numbers: {
      ...one.numbers,
      nacelle_position: one.numbers['nacelle_position']!.map((_, i) => (i * 7919) % 360),
    },
  }))
  expect(frameOf(noisy).turbines.map(({ spells }) => spells)).toEqual(
    frameOf(frozen).turbines.map(({ spells }) => spells),
  )
})

test('an anemometer that reads half against its neighbours near freezing carries ice; in warm air it does not', () => {
  const start = windyFrom(24, 1000)
  const iced = (temperatureC: number) =>
    frameOf(
      farm
        .map((one): TurbineColumns => ({
          ...one,
          numbers: {
            ...one.numbers,
            air_temperature: one.numbers['air_temperature']!.map((_, i) =>
              i >= start - 6 && i < start + 30 ? temperatureC : 10,
            ),
          },
        }))
        .map((one, k) => ({
          ...one,
          numbers: {
            ...one.numbers,
            wind_speed: one.numbers['wind_speed']!.map((value, i) =>
              k === 0 && i >= start && i < start + 24 ? 0.4 * value : value,
            ),
          },
        })),
    ).turbines
  const cold = iced(-1)
  expect(cold[0]!.spells.anemometerIced).toHaveLength(1)
  const spell = cold[0]!.spells.anemometerIced[0]!
  expect(Math.abs(spell.rows - 24)).toBeLessThanOrEqual(2) // the ratio is smoothed over three rows
  expect(spell.value).toBeGreaterThan(0.3)
  expect(spell.value).toBeLessThan(0.5)
  expect(cold[0]!.running[start + 12]).toBe(0)
  for (const other of cold.slice(1)) expect(other.spells.anemometerIced).toEqual([])
  expect(iced(12)[0]!.spells.anemometerIced).toEqual([])
})
