import { DateTime } from 'luxon'
import { expect, test } from 'vitest'
import { findWideColumns, readSeriesName } from '../../src/log/series-names.ts'
import { accountAddsUp, failure, staged } from './staging.ts'

const T0 = Date.UTC(2026, 2, 1)
const STEPS = Array.from({ length: 30 }, (_, i) => i)
const TURBINES = ['Q01', 'Q02', 'Q03']
const iso = (i: number) => new Date(T0 + i * 600_000).toISOString()

/** Values of three turbines, each its own. */
const wind = (turbine: number, i: number) => Number((5 + turbine + i / 8).toFixed(3))
const power = (turbine: number, i: number) => 100 * turbine + i

const EXPECTED = TURBINES.flatMap((name, t) =>
  STEPS.map((i) => ({ turbine: name, time: T0 + i * 600_000, wind_speed: wind(t, i), power: power(t, i) })),
)

function wide(names: (turbine: string) => [string, string]): string {
  const header = ['time', ...TURBINES.flatMap(names)].join(',')
  const lines = STEPS.map((i) => [iso(i), ...TURBINES.flatMap((_, t) => [wind(t, i), power(t, i)])].join(','))
  return `${header}\n${lines.join('\n')}\n`
}

test('one column per turbine and signal gives the same rows as one row per turbine', async () => {
  const forms: ((turbine: string) => [string, string])[] = [
    (t) => [`${t} wind_speed`, `${t} power`],
    (t) => [`${t}.WMET.HorWdSpd`, `${t}.WTUR.W`],
    (t) => [`${t}_WindSpeed_avg`, `${t}_ActivePower (kW)`],
    (t) => [`Wind speed ${t}`, `Power ${t}`],
  ]
  for (const names of forms) {
    const log = await staged({ 'a.csv': wide(names) })
    const label = names('Q01').join()
    expect(log.rows, label).toEqual(EXPECTED)
    expect(log.receipt, label).toMatchObject({ received: 90, accepted: 90, rejected: 0, intervalS: 600 })
    expect(log.receipt.warnings.join(), label).toContain('every line makes 3 rows')
    expect(accountAddsUp(log), label).toBe(true)
  }
})

test('in a wide log a turbine without values at a time is a rejected row, and stamps may mark the end', async () => {
  const text =
    'time,Q01 power,Q02 power\n2026-03-01 00:10,1,2\n2026-03-01 00:20,3,\nsoon,1,2\n2026-03-01 00:30,5,6\n'
  const log = await staged({ 'a.csv': text }, { stamp: 'end' })
  expect(log.receipt).toMatchObject({ received: 7, accepted: 5, rejected: 2, intervalS: 600 })
  expect(log.rows[0]).toEqual({ turbine: 'Q01', time: T0, power: 1 })
  expect(accountAddsUp(log)).toBe(true)
})

test('parts of a machine are no turbines', () => {
  expect(findWideColumns(['time', 'Gearbox temperature', 'Generator temperature'])).toBeNull()
  expect(findWideColumns(['time', 'Bearing 1 temperature', 'Bearing 2 temperature'])).toBeNull()
  expect(findWideColumns(['time', 'Q01 power', 'wind_speed'])).toBeNull()
  expect(readSeriesName('WTG 07 Wind speed (m/s)')).toMatchObject({
    turbine: 'WTG 07',
    target: 'wind_speed',
    unit: 'm/s',
  })
})

test('one value per line gives the same rows, whatever the order, and the last value of a signal and time wins', async () => {
  const lines = TURBINES.flatMap((name, t) =>
    STEPS.flatMap((i) => [
      `${name}.WMET.HorWdSpd,${iso(i)},${wind(t, i)},good`,
      `${name}.WTUR.W,${iso(i)},${power(t, i)},good`,
    ]),
  )
  lines.unshift(`Q01.WTUR.W,${iso(0)},777,good`)
  lines.push(`Q01.WGEN.Oil,${iso(0)},1,good`, 'Q01.WTUR.W,soon,1,good')
  const log = await staged({ 'a.csv': `tag,time,value,quality\n${lines.join('\n')}\n` })
  expect(log.rows).toEqual(EXPECTED)
  expect(log.receipt).toMatchObject({ received: 91, accepted: 90, rejected: 1 })
  expect(log.receipt.columns.find(({ column }) => column === 'Q01.WGEN.Oil')).toMatchObject({
    takenFor: null,
  })
  expect(log.receipt.warnings.join()).toContain('known signals make 90 rows')
  expect(accountAddsUp(log)).toBe(true)
})

test('single values with a column of turbines, in local time over the repeated hour', async () => {
  const zone = 'Europe/Berlin'
  const start = DateTime.fromISO('2024-10-27', { zone }).toMillis()
  const lines: string[] = []
  for (let i = 0; i < 150; i++) {
    const shown = DateTime.fromMillis(start + i * 600_000, { zone }).toFormat('yyyy-MM-dd HH:mm')
    lines.push(`Q01,power,${shown},${i}`, `Q01,wind speed,${shown},${i / 10}`)
  }
  const log = await staged(
    { 'a.csv': `turbine,signal,timestamp,value\n${lines.join('\n')}\n` },
    { timezone: zone },
  )
  expect(log.rows.map((row) => row['time'])).toEqual(
    Array.from({ length: 150 }, (_, i) => start + i * 600_000),
  )
  expect(log.rows.map((row) => row['power'])).toEqual(Array.from({ length: 150 }, (_, i) => i))
})

test('single values of which no signal is known are refused with the list of them', async () => {
  const answer = await failure(staged({ 'a.csv': `tag,time,value\nX.Y,${iso(0)},1\nX.Z,${iso(0)},2\n` }))
  expect(answer.code).toBe('LOG_COLUMNS_MISSING')
  expect(answer.message).toContain('X.Y, X.Z')
})
