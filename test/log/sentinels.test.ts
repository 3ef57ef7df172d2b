import { expect, test } from 'vitest'
import { accountAddsUp, staged } from './staging.ts'

const T0 = Date.UTC(2026, 2, 1)
const HEAD = 'time,turbine,wind_speed,nacelle_position,power\n'
const line = (i: number, ...cells: (string | number)[]) =>
  `${new Date(T0 + i * 600_000).toISOString()},Q01,${cells.join(',')}\n`
const rows = (cells: (i: number) => (string | number)[]) =>
  HEAD + Array.from({ length: 60 }, (_, i) => line(i, ...cells(i))).join('')

test('well-known sentinels far from the other values of their channel are missing, and counted as out of range', async () => {
  const log = await staged({
    'a.csv': rows((i) => [
      5,
      i % 10 === 0 ? -999 : 100 + i,
      i % 20 === 0 ? 32_767 : i % 20 === 1 ? '-999.0' : 30 * i,
    ]),
  })
  expect(log.receipt).toMatchObject({ received: 60, accepted: 60, rejected: 0 })
  const column = (name: string) => log.receipt.columns.find(({ takenFor }) => takenFor === name)
  expect(column('nacelle_position')).toMatchObject({ outOfRange: 6, unreadable: 0, missing: 6 })
  // 32,767 lies beyond 1770 + 1770, but -999 does not lie below 60 - 1710.
  expect(column('power')).toMatchObject({ outOfRange: 3, unreadable: 0, missing: 3 })
  expect(log.rows[1]).toMatchObject({ power: -999, nacelle_position: 101 })
  expect(log.rows[0]).toMatchObject({ power: null, nacelle_position: null })
})

test('a sentinel among values like it is a value', async () => {
  const log = await staged({ 'a.csv': rows((i) => [5, -999 - i, 9999 - 10 * i]) })
  expect(log.rows[0]).toMatchObject({ nacelle_position: -999, power: 9999 })
  expect(log.receipt.columns.every(({ outOfRange }) => outOfRange === 0)).toBe(true)
})

test('rows that hold sentinels alone are rejected, and their repetitions do not win', async () => {
  const text = rows((i) => ['', 100 + i, 500 + i]) + line(7, '', -999, -999) + line(90, '', -999, -999)
  const log = await staged({ 'a.csv': text })
  expect(log.receipt).toMatchObject({ received: 62, accepted: 60, duplicate: 0, rejected: 2 })
  expect(log.receipt.rejectedByReason).toMatchObject([{ reason: 'no-values', rows: 2, firstLine: 62 }])
  expect(log.rows[7]).toMatchObject({ nacelle_position: 107, power: 507 })
  expect(accountAddsUp(log)).toBe(true)
})

test('sentinels are told as written, before units are converted', async () => {
  const text = rows((i) => [5, 100, i === 3 ? -999 : i]).replace('power', 'Power (W)')
  const log = await staged({ 'a.csv': text })
  // 0 to 59 W and -0.999 kW, which lies further below than these are wide.
  expect(log.rows[3]?.['power']).toBe(null)
  expect(log.rows[4]?.['power']).toBe(0.004)
})
