import { expect, test } from 'vitest'
import { findGrid, otherIntervals } from '../../src/log/time-grid.ts'
import { accountAddsUp, staged } from './staging.ts'

const T0 = Date.UTC(2026, 2, 1)
const text = (times: number[], turbine = () => 'Q01') =>
  `time,turbine,power\n${times.map((ms, i) => `${new Date(ms).toISOString()},${turbine()},${i}`).join('\n')}\n`

test('jittering stamps are moved to their grid, counted, and the interval is that of the grid', async () => {
  const times = Array.from({ length: 300 }, (_, i) => T0 + i * 600_000 + ((i * 7919) % 41) * 500 - 10_000)
  const log = await staged({ 'a.csv': text(times) })
  expect(log.rows.map((row) => row['time'])).toEqual(times.map((_, i) => T0 + i * 600_000))
  const offGrid = times.filter((ms) => ms % 600_000 !== 0).length
  expect(log.receipt.warnings.join()).toContain(`${offGrid} stamps stand beside the grid of 600 s`)
  expect(log.receipt.intervalS).toBe(600)
  const ends = await staged({ 'a.csv': text(times) }, { stamp: 'end' })
  expect(ends.rows[0]?.['time']).toBe(T0 - 600_000)
})

test('stamps that keep their distance are left alone, on the full minute or not', async () => {
  const times = Array.from({ length: 50 }, (_, i) => T0 + 7000 + i * 600_000 + (i > 20 ? 3_600_000 : 0))
  const log = await staged({ 'a.csv': text(times) })
  expect(log.rows.map((row) => row['time'])).toEqual(times)
  expect(log.receipt.warnings.join()).not.toContain('grid')
  expect(
    findGrid(
      new Map([
        [600_000, 50],
        [1_200_000, 2],
      ]),
    ),
  ).toBeNull()
})

test('stamps without a grid are left alone', async () => {
  const times = Array.from({ length: 200 }, (_, i) => T0 + i * 600_000 + ((i * 7919) % 599) * 1000)
  const log = await staged({ 'a.csv': text([...times].sort((a, b) => a - b)) })
  expect(log.rows.map((row) => row['time'])).toEqual([...times].sort((a, b) => a - b))
})

test('two stamps that fall on one point of the grid are duplicates, and the last wins', async () => {
  const times = Array.from({ length: 100 }, (_, i) => T0 + i * 600_000 + (i % 2) * 4000)
  const log = await staged({ 'a.csv': text([...times, T0 + 99 * 600_000 - 5000]) })
  expect(log.receipt).toMatchObject({ received: 101, accepted: 100, duplicate: 1, rejected: 0 })
  expect(log.rows.at(-1)?.['power']).toBe(100)
  expect(accountAddsUp(log)).toBe(true)
})

test('mixed intervals are named, gaps are not', async () => {
  const ten = Array.from({ length: 100 }, (_, i) => T0 + i * 600_000)
  const one = Array.from({ length: 60 }, (_, i) => T0 + 100 * 600_000 + i * 60_000)
  const log = await staged({ 'a.csv': text([...ten, ...one]) })
  expect(log.receipt.warnings.join()).toContain('mostly after 600 s, but also after 60 s')
  expect(
    otherIntervals(
      new Map([
        [600_000, 90],
        [1_200_000, 10],
      ]),
      600_000,
      new Map([['Q01', 600_000]]),
    ),
  ).toBeNull()
  let k = 0
  const both = await staged({
    'a.csv': text(
      [0, 0, 1, 2, 2, 3, 4, 4].map((m) => T0 + m * 300_000),
      () => ['Q01', 'Q02', 'Q02', 'Q01', 'Q02', 'Q02', 'Q01', 'Q02'][k++]!,
    ),
  })
  expect(both.receipt.warnings.join()).toContain('mostly after 300 s, but also after 600 s')
})

test('rows out of order are put in order', async () => {
  const times = Array.from({ length: 200 }, (_, i) => T0 + ((i * 37) % 200) * 600_000)
  const log = await staged({ 'a.csv': text(times) })
  expect(log.rows.map((row) => row['time'])).toEqual([...times].sort((a, b) => a - b))
  expect(log.receipt).toMatchObject({ accepted: 200, duplicate: 0, intervalS: 600 })
})
