import { DateTime } from 'luxon'
import { expect, test } from 'vitest'
import { buildCalendar, type Calendar } from '../../src/frame/index.ts'

const TEN_MINUTES = 600_000
const utc = (iso: string): number => Date.parse(iso)

/** Rows of ten minutes on each day of the calendar. */
function rowsPerDay(calendar: Calendar, fromMs: number, toMs: number): number[] {
  const rows = new Array<number>(calendar.days).fill(0)
  for (let at = fromMs; at < toMs; at += TEN_MINUTES) rows[calendar.dayOf(at)]!++
  return rows
}

test('in Berlin the day of the spring change has 138 rows of ten minutes, that of the autumn change 150', () => {
  // Clocks changed on 31 March and 27 October 2024, both at 01:00 UTC (EU directive 2000/84/EC).
  const spring = [utc('2024-03-29T23:00:00Z'), utc('2024-04-01T22:00:00Z')] as const
  expect(rowsPerDay(buildCalendar('Europe/Berlin', ...spring), ...spring)).toEqual([144, 138, 144])
  const autumn = [utc('2024-10-25T22:00:00Z'), utc('2024-10-28T23:00:00Z')] as const
  expect(rowsPerDay(buildCalendar('Europe/Berlin', ...autumn), ...autumn)).toEqual([144, 150, 144])
})

test('the hour is that on the clock before and after a change', () => {
  const calendar = buildCalendar('Europe/Berlin', utc('2024-10-26T00:00:00Z'), utc('2024-10-28T00:00:00Z'))
  expect(calendar.hourOf(utc('2024-10-27T00:10:00Z'))).toBe(2)
  expect(calendar.hourOf(utc('2024-10-27T01:10:00Z'))).toBe(2) // the hour that comes twice
  expect(calendar.hourOf(utc('2024-10-27T02:10:00Z'))).toBe(3)
  const spring = buildCalendar('Europe/Berlin', utc('2024-03-30T00:00:00Z'), utc('2024-04-01T00:00:00Z'))
  expect(spring.hourOf(utc('2024-03-31T00:50:00Z'))).toBe(1)
  expect(spring.hourOf(utc('2024-03-31T01:00:00Z'))).toBe(3) // 02:00 to 03:00 does not exist
})

test('days and hours agree with luxon row by row over a year', () => {
  for (const zone of [
    'UTC',
    'Europe/Berlin',
    'America/Chicago',
    'Asia/Kolkata',
    'Pacific/Auckland',
    'Asia/Kathmandu',
  ]) {
    const from = utc('2024-01-01T00:00:00Z')
    const to = utc('2025-01-01T00:00:00Z')
    const calendar = buildCalendar(zone, from, to)
    const firstDay = DateTime.fromMillis(from, { zone }).toISODate()!
    for (let at = from; at < to; at += 5 * 3_600_000 + TEN_MINUTES) {
      const local = DateTime.fromMillis(at, { zone })
      const day = Math.round((utc(local.toISODate()!) - utc(firstDay)) / 86_400_000)
      if (calendar.dayOf(at) !== day || calendar.hourOf(at) !== local.hour) {
        expect({ at: local.toISO(), day: calendar.dayOf(at), hour: calendar.hourOf(at) }).toEqual({
          at: local.toISO(),
          day,
          hour: local.hour,
        })
      }
    }
    expect(calendar.days).toBe(calendar.dayOf(to - 1) + 1)
    expect(calendar.dayOf(from)).toBe(0)
  }
})

test('a zone half an hour off the hour turns its day at half past', () => {
  const calendar = buildCalendar('Asia/Kolkata', utc('2024-06-01T00:00:00Z'), utc('2024-06-03T00:00:00Z'))
  expect(calendar.dayOf(utc('2024-06-01T18:29:59Z'))).toBe(0)
  expect(calendar.dayOf(utc('2024-06-01T18:30:00Z'))).toBe(1)
  expect(calendar.days).toBe(3) // 05:30 on the 1st to 05:30 on the 3rd
})

test('a window of one row has one day', () => {
  const at = utc('2024-06-01T12:00:00Z')
  expect(buildCalendar('America/Chicago', at, at + TEN_MINUTES).days).toBe(1)
  expect(buildCalendar('America/Chicago', at, at).days).toBe(1)
})

test('an unknown zone has its error code', () => {
  for (const zone of ['Europe/Atlantis', '', 'local time']) {
    expect(() => buildCalendar(zone, 0, 1)).toThrow(expect.objectContaining({ code: 'BAD_OPTION' }))
  }
})
