import { DateTime } from 'luxon'
import { expect, test } from 'vitest'
import { zoneTable } from '../../src/log/zone-table.ts'
import { staged } from './staging.ts'

/** Change days of 2024 by the laws in force: EU last Sunday of March and October, US second Sunday of March and first of November. */
const CHANGES = [
  { zone: 'Europe/Berlin', spring: '2024-03-31', autumn: '2024-10-27' },
  { zone: 'Europe/London', spring: '2024-03-31', autumn: '2024-10-27' },
  { zone: 'America/Chicago', spring: '2024-03-10', autumn: '2024-11-03' },
]

const wall = (text: string) => Date.parse(`${text}Z`)

test('the skipped hour has no instant and the repeated hour has two', () => {
  const berlin = zoneTable('Europe/Berlin')
  expect(berlin.first(wall('2024-03-31T01:59:59'))).toBe(Date.parse('2024-03-31T00:59:59Z'))
  expect(berlin.first(wall('2024-03-31T02:00:00'))).toBeNaN()
  expect(berlin.first(wall('2024-03-31T02:59:59'))).toBeNaN()
  expect(berlin.first(wall('2024-03-31T03:00:00'))).toBe(Date.parse('2024-03-31T01:00:00Z'))
  expect(berlin.first(wall('2024-10-27T02:30:00'))).toBe(Date.parse('2024-10-27T00:30:00Z'))
  expect(berlin.second(wall('2024-10-27T02:30:00'))).toBe(Date.parse('2024-10-27T01:30:00Z'))
  expect(berlin.second(wall('2024-10-27T03:00:00'))).toBeNaN()
})

test('away from changes every wall clock agrees with luxon, over years and zones', () => {
  for (const zone of [
    'Europe/Berlin',
    'America/Chicago',
    'Australia/Lord_Howe',
    'Asia/Kathmandu',
    'Africa/Casablanca',
  ]) {
    const table = zoneTable(zone)
    for (let ms = Date.UTC(2019, 11, 25); ms < Date.UTC(2026, 0, 5); ms += 5 * 3_600_000 + 60_000) {
      const local = DateTime.fromMillis(ms, { zone })
      const shown = ms + local.offset * 60_000
      expect([table.first(shown), table.second(shown)], `${zone} ${local.toISO()!}`).toContain(ms)
    }
  }
})

test('change days hold 138 and 150 rows of ten minutes, whichever edge the stamp marks', async () => {
  for (const { zone, spring, autumn } of CHANGES) {
    for (const [day, rows] of [
      [spring, 138],
      [autumn, 150],
    ] as const) {
      for (const stamp of ['begin', 'end'] as const) {
        const start = DateTime.fromISO(day, { zone })
        const instants = Array.from({ length: rows }, (_, i) => start.toMillis() + i * 600_000)
        expect(DateTime.fromMillis(instants.at(-1)! + 600_000, { zone }).toISODate()).not.toBe(day)
        const shift = stamp === 'end' ? 600_000 : 0
        const lines = instants.map(
          (ms, i) => `${DateTime.fromMillis(ms + shift, { zone }).toFormat('yyyy-MM-dd HH:mm:ss')},Q01,${i}`,
        )
        const log = await staged(
          { 'a.csv': `time,turbine,power\n${lines.join('\n')}\n` },
          { timezone: zone, stamp },
        )
        const label = `${zone} ${day} ${stamp}`
        expect(log.receipt, label).toMatchObject({
          received: rows,
          accepted: rows,
          duplicate: 0,
          rejected: 0,
        })
        expect(
          log.rows.map((row) => row['time']),
          label,
        ).toEqual(instants)
        expect(
          log.rows.map((row) => row['power']),
          label,
        ).toEqual(instants.map((_, i) => i))
      }
    }
  }
})

test('rows that run backwards in time keep the two passes of the repeated hour apart', async () => {
  const zone = 'Europe/Berlin'
  const start = DateTime.fromISO('2024-10-27', { zone }).toMillis()
  const instants = Array.from({ length: 150 }, (_, i) => start + i * 600_000)
  const lines = instants.map(
    (ms) => `${DateTime.fromMillis(ms, { zone }).toFormat('dd.MM.yyyy HH:mm')};Q01;5`,
  )
  const log = await staged(
    { 'a.csv': `time;turbine;power\n${lines.reverse().join('\n')}\n` },
    { timezone: zone },
  )
  expect(log.rows.map((row) => row['time'])).toEqual(instants)
  expect(log.receipt.warnings.join()).toContain('12 rows lie in the hour that the clock shows twice')
})

test('several turbines side by side each have their own repeated hour', async () => {
  const zone = 'America/Chicago'
  const start = DateTime.fromISO('2024-11-03', { zone }).toMillis()
  const lines: string[] = []
  for (let i = 0; i < 150; i++) {
    for (const turbine of ['Q01', 'Q02']) {
      lines.push(
        `${DateTime.fromMillis(start + i * 600_000, { zone }).toFormat('MM/dd/yyyy HH:mm')},${turbine},${i}`,
      )
    }
  }
  const log = await staged(
    { 'a.csv': `time,turbine,power\n${lines.join('\n')}\n` },
    { timezone: zone, dateOrder: 'mdy' },
  )
  expect(log.receipt).toMatchObject({ accepted: 300, duplicate: 0, rejected: 0 })
  expect(log.rows.filter((row) => row['turbine'] === 'Q02').map((row) => row['power'])).toEqual(
    Array.from({ length: 150 }, (_, i) => i),
  )
})

test('stamps in the skipped hour are rejected and named', async () => {
  const log = await staged(
    {
      'a.csv': 'time,turbine,power\n2024-03-31 01:50,Q01,1\n2024-03-31 02:10,Q01,2\n2024-03-31 03:00,Q01,3\n',
    },
    { timezone: 'Europe/Berlin' },
  )
  expect(log.receipt.rejectedByReason).toMatchObject([{ reason: 'spring-gap', rows: 1, firstLine: 3 }])
  expect(log.rows.map((row) => row['power'])).toEqual([1, 3])
})

test('a month in local time equals the same month in UTC', async () => {
  for (const { zone } of CHANGES) {
    for (const month of [3, 10, 11]) {
      const start = DateTime.fromObject({ year: 2024, month }, { zone })
      const end = start.plus({ months: 1 }).toMillis()
      const instants: number[] = []
      for (let ms = start.toMillis(); ms < end; ms += 600_000) instants.push(ms)
      const write = (format: (ms: number) => string) =>
        `time,turbine,power\n${instants.map((ms, i) => `${format(ms)},Q01,${i}`).join('\n')}\n`
      const utc = await staged({ 'a.csv': write((ms) => new Date(ms).toISOString()) })
      const local = await staged(
        { 'a.csv': write((ms) => DateTime.fromMillis(ms, { zone }).toFormat('yyyy-MM-dd HH:mm')) },
        { defaultTimezone: zone },
      )
      expect(local.rows, `${zone} ${month}`).toEqual(utc.rows)
      expect(local.receipt.accepted).toBe(instants.length)
    }
  }
})
