import { expect, test } from 'vitest'
import { readName } from '../../src/log/column-names.ts'
import { findUnit } from '../../src/log/units.ts'
import { isVaneByValues } from '../../src/log/vane-by-values.ts'
import { staged } from './staging.ts'

test('usual names are taken for their channels, with statistics and units told apart', () => {
  const expected: Record<string, [string, string, string | null]> = {
    'wind speed': ['wind_speed', '', null],
    WindSpeed_avg: ['wind_speed', '', null],
    Wspd: ['wind_speed', '', null],
    'Wind speed (m/s)': ['wind_speed', '', 'm/s'],
    'Wind speed, Standard deviation (m/s)': ['wind_speed', 'sd', 'm/s'],
    'Wind speed, Maximum (m/s)': ['wind_speed', 'max', 'm/s'],
    WindSpeedStdDev: ['wind_speed', 'sd', null],
    'Power (kW)': ['power', '', 'kW'],
    ActivePower: ['power', '', null],
    power_kw: ['power', '', 'kw'],
    'Nacelle position (°)': ['nacelle_position', '', '°'],
    'Nacelle position, Minimum (°)': ['nacelle_position', 'min', '°'],
    'Wind direction (°)': ['wind_direction', '', '°'],
    'Wind direction relative': ['vane', '', null],
    'Yaw error': ['vane', '', null],
    yaw_error_deg: ['vane', '', 'deg'],
    'Vane position 1+2 (°)': ['vane', '', '°'],
    'WMET.HorWdSpd': ['wind_speed', '', null],
    'WMET.HorWdDir': ['wind_direction', '', null],
    WNAC_Dir: ['nacelle_position', '', null],
    'WTUR.W': ['power', '', null],
    'WYAW.YwAng': ['nacelle_position', '', null],
    'WYAW.YawAng': ['nacelle_position', '', null],
    'WROT.BlPthAngVal': ['pitch', '', null],
    'WROT.RotSpd': ['rotor_speed', '', null],
    'WMET.EnvTmp': ['air_temperature', '', null],
    'WMET.HorWdSpd.max': ['wind_speed', 'max', null],
    'Rotor speed [RPM]': ['rotor_speed', '', 'RPM'],
    'Ambient temperature (°C)': ['air_temperature', '', '°C'],
    vane_sd: ['vane', 'sd', null],
    power_avg: ['power', '', null],
    'Date and time': ['time', '', null],
    timestamp: ['time', '', null],
    Turbine_ID: ['turbine', '', null],
    'Yaw active': ['yaw_active', '', null],
  }
  for (const [name, [target, statistic, unit]] of Object.entries(expected)) {
    expect(readName(name), name).toMatchObject({ target, statistic, unit })
  }
})

test('names that only contain a usual one are left alone', () => {
  for (const name of [
    'Gearbox oil temperature',
    'Reactive power (kvar)',
    'Generator speed',
    'Nacelle temperature',
    'Energy export (kWh)',
    'Power factor',
    'Hydraulic pressure',
    'Itmp',
    '',
  ]) {
    expect(readName(name), name).toBeUndefined()
  }
})

test('a column marked as mean is preferred to a bare one, and statistics are kept beside it', async () => {
  const text =
    'time,turbine,Wind speed min,Wind speed,Wind speed avg,Wind speed std\n2026-03-01T00:00:00Z,Q01,1,2,3,0.5\n'
  const log = await staged({ 'a.csv': text })
  expect(log.rows[0]).toMatchObject({ wind_speed: 3, wind_speed_min: 1, wind_speed_sd: 0.5 })
  const bare = log.receipt.columns.find(({ column }) => column === 'Wind speed')
  expect(bare).toMatchObject({ takenFor: null, why: 'not used: wind_speed is taken from Wind speed avg' })
})

test('units are known by their spellings and only for what they measure', () => {
  expect(findUnit('km/h', 'm/s')).toMatchObject({ divideBy: 3.6 })
  expect(findUnit('m·s⁻¹', 'm/s')).toBeDefined()
  expect(findUnit('º', 'deg')).toBeDefined()
  expect(findUnit('kW', 'm/s')).toBeUndefined()
  expect(findUnit('furlong', 'm/s')).toBeUndefined()
})

test('a wind direction that is signed and stays near zero while producing is taken for the vane, and it is said', async () => {
  const lines = Array.from({ length: 60 }, (_, i) => {
    const isParked = i % 3 === 0
    return `${new Date(Date.UTC(2026, 2, 1) + i * 600_000).toISOString()},Q01,${isParked ? 150 : (i % 7) - 3},${isParked ? 0 : 500}`
  })
  const log = await staged({ 'a.csv': `time,turbine,Wdir,power\n${lines.join('\n')}\n` })
  const column = log.receipt.columns.find(({ column: name }) => name === 'Wdir')
  expect(column?.takenFor).toBe('vane')
  expect(column?.why).toContain('near zero while producing')
  const circle = Array.from({ length: 60 }, (_, i) => String((i * 6) % 360))
  expect(isVaneByValues(circle, null)).toBe(false)
  expect(
    isVaneByValues(
      circle.map((x) => String(Number(x) - 180)),
      null,
    ),
  ).toBe(false)
  // Always from the north-north-east and never negative: a direction against north.
  expect(
    isVaneByValues(
      circle.map((_, i) => String(10 + (i % 9))),
      null,
    ),
  ).toBe(false)
})
