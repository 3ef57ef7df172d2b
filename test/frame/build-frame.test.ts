import { expect, test } from 'vitest'
import { buildFrame, countReasons, type TurbineColumns, type TurbineFrame } from '../../src/frame/index.ts'
import { SET_ASIDE_REASONS, type SiteFile } from '../../src/sheet/index.ts'
import { columnsOf } from './columns.ts'
import { SETTINGS } from './settings.ts'

const N = 1440

function frameOf(columns: TurbineColumns, site: SiteFile = {}, ratedPowerKw?: number): TurbineFrame {
  return buildFrame([columns], { site, settings: SETTINGS, intervalS: 600, ratedPowerKw }).turbines[0]!
}

const siteWith = (setup: object): SiteFile => ({ turbines: [{ turbine: 'T1', ...setup }] })
const filled = (value: number): Float64Array => new Float64Array(N).fill(value)
const name = (code: number): string => (code === 0 ? 'used' : SET_ASIDE_REASONS[code - 1]!)

test('the vane is wrapped to [-180, 180) and turned to the sign of the service', () => {
  const raw = Float64Array.from({ length: N }, (_, i) => [356, -4, 180, 10, NaN, 724][i % 6]!)
  const plain = frameOf(columnsOf(N, { vane: raw }))
  expect([...plain.vane.subarray(0, 6)]).toEqual([-4, -4, -180, 10, NaN, 4])
  const turned = frameOf(columnsOf(N, { vane: raw }), siteWith({ vane: { sign: -1 } }))
  expect([...turned.vane.subarray(0, 6)]).toEqual([4, 4, -180, -10, NaN, -4])
})

test('the indicated direction is nacelle position plus vane, else the logged wind direction', () => {
  const nacelle = Float64Array.from({ length: N }, (_, i) => [355, -10, 725, NaN][i % 4]!)
  const vane = filled(8)
  const own = frameOf(columnsOf(N, { nacelle_position: nacelle, vane }))
  expect([...own.indicatedDirection.subarray(0, 4)]).toEqual([3, 358, 13, NaN])
  expect(frameOf(columnsOf(N, { wind_direction: filled(77) })).indicatedDirection[0]).toBe(77)
  expect(frameOf(columnsOf(N)).indicatedDirection[0]).toBeNaN()
})

test('density comes from temperature and pressure, by hand', () => {
  // p / (R T) with R = 287.05 J/(kg K), IEC 61400-12-1: 101325 / (287.05 x 288.15) = 1.2250; 95000 / (287.05 x 273.15) = 1.2116.
  const warm = frameOf(columnsOf(N, { air_temperature: filled(15), air_pressure: filled(1013.25) }))
  expect(warm.density[0]).toBeCloseTo(1.225, 3)
  const cold = frameOf(columnsOf(N, { air_temperature: filled(0), air_pressure: filled(950) }))
  expect(cold.density[0]).toBeCloseTo(1.2116, 3)
  // Normalised speed is u (rho / 1.225)^(1/3), IEC 61400-12-1.
  expect(cold.normalisedSpeed[7]! / cold.windSpeed[7]!).toBeCloseTo((1.2116 / 1.225) ** (1 / 3), 4)
  expect(cold.densitySource).toContain('pressure of the log')
})

test('without pressure the standard atmosphere at the hub stands in, and the source says so', () => {
  // ISO 2533 at 1000 m: 898.76 hPa; 89876 / (287.05 x 288.15) = 1.0866.
  const high = frameOf(
    columnsOf(N, { air_temperature: filled(15) }),
    siteWith({ altitudeM: 900, hubHeightM: 100 }),
  )
  expect(high.density[0]).toBeCloseTo(1.0866, 3)
  expect(high.densitySource).toContain('standard atmosphere at 900 m')
  expect(frameOf(columnsOf(N, { air_temperature: filled(15) })).densitySource).toContain('no altitude given')
})

test('without a temperature the wind speed is taken as read, and a note says so', () => {
  for (const numbers of [{}, { air_temperature: filled(NaN), air_pressure: filled(1000) }]) {
    const frame = frameOf(columnsOf(N, numbers))
    expect(frame.density.every((value) => Number.isNaN(value))).toBe(true)
    expect(frame.normalisedSpeed).toEqual(frame.windSpeed)
    expect(frame.notes.join()).toContain('no air temperature')
  }
})

test('a lost cell of temperature or pressure takes the median of the log', () => {
  const gap = (value: number) => Float64Array.from({ length: N }, (_, i) => (i === 3 ? NaN : value))
  const frame = frameOf(columnsOf(N, { air_temperature: gap(10), air_pressure: gap(980) }))
  expect(frame.density[3]).toBe(frame.density[4])
})

test('rated power comes from the site file, else the request, else the log', () => {
  const columns = columnsOf(N)
  expect(frameOf(columns, siteWith({ ratedPowerKw: 2100 }), 1900)).toMatchObject({
    ratedPowerKw: 2100,
    ratedPowerSource: 'site file',
  })
  expect(frameOf(columns, {}, 1900)).toMatchObject({ ratedPowerKw: 1900, ratedPowerSource: 'request' })
  const plateau = columns.numbers['power']!.map((power) => Math.min(1500, power))
  expect(frameOf(columnsOf(N, { power: plateau }))).toMatchObject({
    ratedPowerKw: 1500,
    ratedPowerSource: 'log',
  })
  // Calm and calmer: the higher a wind speed, the rarer.
  const weak = columns.time.map((_, i) => 3 + 5 * ((i % 97) / 97) ** 2)
  const calm = frameOf(columnsOf(N, { wind_speed: weak, power: weak.map((speed) => speed ** 3) }))
  expect(calm.ratedPowerSource).toBe('unknown')
  expect(calm.ratedPowerKw).toBeNaN()
})

test('an excluded window of the site file holds for all turbines, or for the one it names', () => {
  const farm = ['T1', 'T2'].map((turbine) => ({ ...columnsOf(N), turbine }))
  const build = (turbine?: string) =>
    buildFrame(farm, {
      site: {
        exclude: [
          {
            from: '2026-01-02T00:00:00Z',
            to: '2026-01-02T01:00:00Z',
            ...(turbine === undefined ? {} : { turbine }),
          },
        ],
      },
      settings: SETTINGS,
      intervalS: 600,
    }).turbines.map(({ reason }) => countReasons(reason).excluded)
  expect(build()).toEqual([6, 6])
  expect(build('T2')).toEqual([0, 6])
  expect(build('T9')).toEqual([0, 0])
})

test('a window stated with an offset from UTC is the same window', () => {
  const excludedBy = (from: string, to: string) =>
    [...frameOf(columnsOf(N), { exclude: [{ from, to }] }).reason]
      .map(name)
      .map((reason) => reason === 'excluded')
  expect(excludedBy('2026-01-02T01:00:00+01:00', '2026-01-02T02:00:00+01:00')).toEqual(
    excludedBy('2026-01-02T00:00:00Z', '2026-01-02T01:00:00Z'),
  )
})

test('rows are used from the lowest wind speed to the knee of the measured curve', () => {
  const frame = frameOf(columnsOf(N), siteWith({ ratedPowerKw: 2000 }))
  expect(frame.windMinMs).toBe(SETTINGS.windMinMs)
  // curveKw reaches 80 % of 2000 kW where c / sqrt(1 + c^2) = 0.8, c = (u / 9)^3 = 4 / 3: u = 9.906.
  expect(Math.abs(frame.windMaxMs - 9 * (4 / 3) ** (1 / 3))).toBeLessThan(0.1)
  for (let i = 0; i < N; i++) {
    const speed = frame.windSpeed[i]!
    const inside = speed >= SETTINGS.windMinMs && speed <= frame.windMaxMs
    expect(name(frame.reason[i]!), `${speed} m/s`).toBe(inside ? 'used' : 'outside-wind-range')
  }
})

test('days follow the clock of the site, and nights are from seven to seven on it', () => {
  const berlin = frameOf(columnsOf(N), { timezone: 'Europe/Berlin' })
  expect(berlin.day[0]).toBe(0)
  expect(berlin.day[23 * 6]).toBe(1) // 23:00 UTC is midnight
  expect([5, 6, 17, 18].map((hour) => berlin.night[hour * 6])).toEqual([1, 0, 0, 1]) // 06:00, 07:00, 18:00, 19:00
})

test('the window runs to the end of the last interval, over all turbines', () => {
  const late = columnsOf(N)
  const early = { ...columnsOf(10), turbine: 'T0' }
  const empty = { ...columnsOf(0), turbine: 'T9' }
  const frame = buildFrame([early, late, empty], { site: {}, settings: SETTINGS, intervalS: 600 })
  expect(new Date(frame.fromMs).toISOString()).toBe('2026-01-01T00:00:00.000Z')
  expect(new Date(frame.toMs).toISOString()).toBe('2026-01-11T00:00:00.000Z')
  expect(frame.calendar.days).toBe(10)
  expect(frame.turbines[2]!.time.length).toBe(0)
})

test('a log with a status but no word on which statuses run says how running was judged', () => {
  const status = new Array<string>(N).fill('ok')
  expect(frameOf(columnsOf(N, {}, { status })).notes.join()).toContain('runningStatus')
  expect(frameOf(columnsOf(N, {}, { status }), { runningStatus: ['ok'] }).notes.join()).not.toContain(
    'runningStatus',
  )
})

test('turbulence is the spread of the wind speed over its mean', () => {
  const frame = frameOf(columnsOf(N, { wind_speed_sd: filled(0.6) }))
  expect(frame.turbulence[5]).toBe(0.6 / frame.windSpeed[5]!)
  expect(frameOf(columnsOf(N)).turbulence[5]).toBeNaN()
})

test('a wind speed or power that is not in the log sets all rows aside and throws nothing', () => {
  for (const channel of ['wind_speed', 'vane', 'power']) {
    const frame = frameOf(columnsOf(N, { [channel]: filled(NaN) }))
    expect(countReasons(frame.reason)).toMatchObject({ used: 0, 'missing-channel': N })
  }
})

test('the columns handed in stay as they were', () => {
  const columns = columnsOf(N, { air_temperature: filled(5) })
  const copy = structuredClone(columns)
  frameOf(columns, siteWith({ vane: { sign: -1 } }))
  expect(columns).toEqual(copy)
})
