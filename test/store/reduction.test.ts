import { expect, test } from 'vitest'
import { intervalStatistics, wrap180, wrap360 } from '../../src/kernel/angle/index.ts'
import { simulateFarm, type SimulatedTurbine } from '../../src/simulate/index.ts'
import { isHighRate, reduceRows, type TurbineRows } from '../../src/store/index.ts'
import { makeFolder } from './folder.ts'
import { parquetOf, scansOver } from './reduction-rows.ts'

const START_MS = Date.UTC(2026, 2, 1)

/** One turbine, one row every `stepS`; missing = empty. */
function csvOf(columns: Record<string, readonly (number | string | null)[]>, stepS: number): string {
  const names = Object.keys(columns)
  const rows = columns[names[0]!]!.length
  const lines = Array.from({ length: rows }, (_, i) =>
    ['T1', START_MS + i * stepS * 1000, ...names.map((name) => columns[name]![i] ?? '')].join(','),
  )
  return `turbine,time,${names.join(',')}\n${lines.join('\n')}\n`
}

async function reduce(csv: string, options: { threads?: number; order?: string; intervalS?: number } = {}) {
  const folder = await makeFolder()
  const scans = await scansOver(folder, options.threads)
  return reduceRows(scans, await parquetOf(scans, folder, csv, options.order), options.intervalS ?? 1)
}

const repeated = (samples: readonly number[], times: number): number[] =>
  Array.from({ length: times }, () => samples).flat()

test('intervals from 20 Hz to some seconds are high rate, and what divides ten minutes in two or more', () => {
  for (const intervalS of [0.05, 0.1, 1, 2, 7, 10, 30, 60, 120, 300]) {
    expect(isHighRate(intervalS), `${intervalS} s`).toBe(true)
  }
  for (const intervalS of [null, NaN, 0, 420, 599, 600, 900, 3600]) {
    expect(isHighRate(intervalS), String(intervalS)).toBe(false)
  }
})

test('mean and sigma of directions come out as the worked values', async () => {
  // Unit-vector mean and Yamartino's sigma, worked by independent scripts (double precision, 1e-6 degrees); 180 / sqrt(3) for
  // two opposite directions is also in Yamartino (1984).
  const worked = [
    { samples: [1, 0, 359], mean: 0, sigma: 0.8164935 },
    { samples: [350, 10], mean: 0, sigma: 10.0081003 },
    { samples: [350, 355, 5, 10, 20], mean: 3.9913929, sigma: 10.6763741 },
    { samples: [315, 45], mean: 0, sigma: 47.4612705 },
    { samples: [270, 90], mean: NaN, sigma: 103.9230485 },
    { samples: Array.from({ length: 36 }, (_, i) => i * 10), mean: NaN, sigma: 103.9230485 },
  ]
  for (const { samples, mean, sigma } of worked) {
    const [turbine] = await reduce(csvOf({ wind_direction: samples }, 1))
    const { numbers } = turbine!
    const got = numbers['wind_direction']![0]!
    if (Number.isNaN(mean)) expect(got, String(samples)).toBeNaN()
    else expect(Math.abs(wrap180(got - mean)), String(samples)).toBeLessThan(1e-6)
    expect(Math.abs(numbers['wind_direction_sd']![0]! - sigma), String(samples)).toBeLessThan(1e-6)
  }
})

test('numbers get mean, population SD and extremes; the sums are exact where floating ones lose their digits', async () => {
  const power = repeated([2000.1, 2000.2, 2000.3], 200)
  const [turbine] = await reduce(csvOf({ power, pitch: repeated([1.1], 600) }, 1))
  const { numbers, time } = turbine!
  expect(Array.from(time)).toEqual([START_MS])
  expect(numbers['power']![0]).toBe(2000.2)
  // By hand: 0.1 sqrt(2 / 3).
  expect(Math.abs(numbers['power_sd']![0]! - 0.1 * Math.sqrt(2 / 3))).toBeLessThan(1e-15)
  expect([numbers['power_min']![0], numbers['power_max']![0]]).toEqual([2000.1, 2000.3])
  expect([numbers['pitch']![0], numbers['pitch_sd']![0]]).toEqual([1.1, 0])
  expect(numbers['coverage']![0]).toBe(1)
})

test('a position wound over turns keeps them; a wrapped one is averaged on the circle, on its own scale', async () => {
  const [wound] = await reduce(csvOf({ nacelle_position: [...repeated([719, 721], 300)] }, 1))
  expect(wound!.numbers['nacelle_position']![0]).toBe(720)
  expect(wound!.numbers['nacelle_position_sd']![0]).toBe(1)
  const [wrapped] = await reduce(csvOf({ nacelle_position: [...repeated([359, 3], 300)] }, 1))
  expect(wrapped!.numbers['nacelle_position']![0]).toBeCloseTo(1, 9)
  expect(wrapped!.numbers['nacelle_position_min']![0]).toBeNaN() // the reading wrapped: its extremes mean nothing
  const [signed] = await reduce(csvOf({ nacelle_position: [...repeated([179, -177], 300)] }, 1))
  expect(signed!.numbers['nacelle_position']![0]).toBeCloseTo(-179, 9)
  const [still] = await reduce(csvOf({ vane: repeated([123.4], 600) }, 1))
  expect(still!.numbers['vane_sd']![0]).toBe(0)
})

test('the state that held longest stands for the interval; of two equally long ones the first in byte order', async () => {
  const held = (text: string, rows: number): string[] => Array.from({ length: rows }, () => text)
  const status = [
    ...held('run', 301),
    ...held('stop', 299),
    ...held('b', 200),
    ...held('a', 200),
    ...held('', 200),
  ]
  const [turbine] = await reduce(csvOf({ power: repeated([1], 1200), status }, 1))
  expect(turbine!.texts['status']).toEqual(['run', 'a'])
})

test('raw words have no mean and are left out; a spread without its mean is averaged', async () => {
  const [turbine] = await reduce(
    csvOf({ power: repeated([5], 600), vane_code: repeated([513], 600), pitch_sd: repeated([1, 3], 300) }, 1),
  )
  const names = ['coverage', 'pitch_sd', 'power', 'power_max', 'power_min', 'power_sd']
  expect(Object.keys(turbine!.numbers).sort()).toEqual(names)
  expect(turbine!.numbers['pitch_sd']![0]).toBe(2)
})

test('coverage is rows there over rows due, by the step of the turbine’s own rows', async () => {
  const seconds = csvOf({ power: repeated([5], 900) }, 1)
  const tenths = csvOf({ power: repeated([5], 90) }, 10)
    .replaceAll('T1', 'T2')
    .split('\n')
    .slice(1)
    .join('\n')
  const [fast, slow] = await reduce(seconds + tenths)
  expect(Array.from(fast!.numbers['coverage']!)).toEqual([1, 0.5])
  expect(Array.from(slow!.numbers['coverage']!)).toEqual([1, 0.5])
  const tenHertz = await reduce(csvOf({ power: repeated([5], 6000) }, 0.1))
  expect(Array.from(tenHertz[0]!.numbers['coverage']!)).toEqual([1])
})

test('ten-minute rows among high-rate ones stay as they are, whole and with their own spread', async () => {
  const ten = csvOf({ wind_speed: [8, 9, 10], wind_speed_sd: [1, 1.2, 0.8], vane: [3, -2, 359] }, 600)
  const [turbine] = await reduce(ten, { intervalS: 600 })
  const { numbers } = turbine!
  expect(Array.from(numbers['coverage']!)).toEqual([1, 1, 1])
  expect(Array.from(numbers['wind_speed']!)).toEqual([8, 9, 10])
  numbers['wind_speed_sd']!.forEach((sd, i) => {
    expect(sd).toBeCloseTo([1, 1.2, 0.8][i]!, 12)
  })
  expect(numbers['vane_sd']!.every(Number.isNaN)).toBe(true) // one value alone has no spread
})

test('spreads inside the rows are added in squares to the spread between them', async () => {
  // By hand: rows of SD 3 about 6 and 14 (SD 4 between them) have SD 5.
  const [turbine] = await reduce(
    csvOf(
      {
        power: repeated([6, 14], 5),
        power_sd: repeated([3], 10),
        power_min: repeated([1, 2], 5),
        power_max: repeated([30], 10),
      },
      60,
    ),
  )
  const { numbers } = turbine!
  expect(numbers['power_sd']![0]).toBe(5)
  expect([numbers['power_min']![0], numbers['power_max']![0]]).toEqual([1, 30])
})

test('a mean of few values is missing, unless the channel always comes that seldom', async () => {
  const n = 3600
  const vane = Array.from({ length: n }, (_, i) => (i >= 600 && i < 1100 ? null : 2))
  const air = Array.from({ length: n }, (_, i) => (i % 60 === 0 ? 11.5 : null))
  const [turbine] = await reduce(csvOf({ vane, air_temperature: air }, 1))
  expect(turbine!.numbers['vane']!.map((value) => Math.round(value * 1e6) / 1e6)).toEqual(
    Float64Array.from([2, NaN, 2, 2, 2, 2]),
  )
  expect(Array.from(turbine!.numbers['air_temperature']!)).toEqual([11.5, 11.5, 11.5, 11.5, 11.5, 11.5])
})

/** A simulated day; a wound position is set two turns on, where it cannot be taken for a wrapped one. */
function simulatedDay(rateS: number, nacelleScale: 'wrapped' | 'wound') {
  const turbine = simulateFarm({ seed: 11, turbines: 1, days: 1, rateS, nacelleScale }).turbines[0]!
  const turns = nacelleScale === 'wound' ? 720 : 0
  const nacelle_position = turbine.columns.nacelle_position.map((position) => position + turns)
  return { ...turbine, columns: { ...turbine.columns, nacelle_position } }
}

const NAMES = [
  'wind_speed',
  'vane',
  'nacelle_position',
  'power',
  'pitch',
  'rotor_speed',
  'yaw_active',
] as const

function loggedCsv(turbine: SimulatedTurbine, decimals: number): string {
  const lines = Array.from(turbine.timeMs, (time, i) =>
    [
      turbine.turbine,
      time,
      ...NAMES.map((name) => turbine.columns[name][i]!.toFixed(decimals)),
      turbine.status[i]!,
    ].join(','),
  )
  return `turbine,time,${NAMES.join(',')},status\n${lines.join('\n')}\n`
}

test('a simulated day at 1 Hz is reduced to what plain loops over its rows give', async () => {
  const second = simulatedDay(1, 'wrapped')
  const decimals = 3
  const [reduced] = await reduce(loggedCsv(second, decimals))
  expect(reduced!.time.length).toBe(144)
  const logged = (name: (typeof NAMES)[number], i: number) =>
    Number(second.columns[name][i]!.toFixed(decimals))
  for (let bin = 0; bin < 144; bin++) {
    for (const name of NAMES) {
      const samples = Float64Array.from({ length: 600 }, (_, i) => logged(name, bin * 600 + i))
      const mean = reduced!.numbers[name]![bin]!
      if (name === 'vane' || name === 'nacelle_position') {
        const { direction, sigma } = intervalStatistics(samples)
        expect(Math.abs(wrap180(mean - direction)), `${name} ${bin}`).toBeLessThan(1e-9)
        // Sines rounded to 5e-13 move eps^2 by 1e-12, sigma by 1e-12 / eps: 3e-8 degrees at the least spread here, 0.1 degrees.
        const tolerance = sigma < 0.1 ? 1e-4 : 1e-7
        expect(Math.abs(reduced!.numbers[`${name}_sd`]![bin]! - sigma), `${name} ${bin}`).toBeLessThan(
          tolerance,
        )
        continue
      }
      const direct = samples.reduce((sum, value) => sum + value, 0) / 600
      expect(Math.abs(mean - direct), `${name} ${bin}`).toBeLessThan(1e-9)
      if (name === 'yaw_active') continue
      const sd = Math.sqrt(samples.reduce((sum, value) => sum + (value - direct) ** 2, 0) / 600)
      expect(Math.abs(reduced!.numbers[`${name}_sd`]![bin]! - sd), `${name} ${bin}`).toBeLessThan(1e-9)
      expect(reduced!.numbers[`${name}_min`]![bin]).toBe(Math.min(...samples))
      expect(reduced!.numbers[`${name}_max`]![bin]).toBe(Math.max(...samples))
    }
  }
  expect(reduced!.numbers['coverage']!.every((share) => share === 1)).toBe(true)
})

test('a 10-minute log of a simulated farm agrees with the reduction of its 1 s log to the logger’s rounding', async () => {
  for (const scale of ['wrapped', 'wound'] as const) {
    const ten = simulatedDay(600, scale)
    const [reduced] = await reduce(loggedCsv(simulatedDay(1, scale), 2))
    const off = (name: (typeof NAMES)[number], isAngle: boolean) =>
      Math.max(
        ...reduced!.numbers[name]!.map((value, i) => {
          const difference = value - ten.columns[name][i]!
          return Math.abs(isAngle ? wrap180(difference) : difference)
        }),
      )
    // Half a unit of the second decimal.
    for (const name of NAMES)
      expect(off(name, name === 'vane' || name === 'nacelle_position'), name).toBeLessThan(0.005)
    if (scale === 'wound') expect(off('nacelle_position', false)).toBeLessThan(0.005)
    else expect(reduced!.numbers['nacelle_position']!.every((value) => value === wrap360(value))).toBe(true)
    expect(reduced!.texts['status']).toEqual(ten.status)
    for (const name of ['wind_speed_sd', 'vane_sd', 'power_sd'] as const) {
      reduced!.numbers[name]!.forEach((sd, i) => {
        expect(Math.abs(sd - ten.columns[name][i]!), `${name} ${i}`).toBeLessThan(0.01)
      })
    }
  }
})

test('order of rows and number of threads change nothing, to the last bit', async () => {
  const csv = loggedCsv(simulatedDay(1, 'wrapped'), 3)
  const plain = (rows: TurbineRows[]) =>
    JSON.stringify(rows, (_, value: unknown) =>
      ArrayBuffer.isView(value) ? Array.from(value as Float64Array, String) : value,
    )
  const one = plain(await reduce(csv, { threads: 1 }))
  expect(plain(await reduce(csv, { threads: 2 }))).toBe(one)
  expect(plain(await reduce(csv, { threads: 2, order: 'hash(time)' }))).toBe(one)
})
