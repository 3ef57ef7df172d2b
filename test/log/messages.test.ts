import { expect, test } from 'vitest'
import { failure, staged } from './staging.ts'

const TEXT = 'time,turbine,wind_speed\n2026-03-01T00:00:00Z,Q01,5\n'

test.each([
  ['an unknown time zone', TEXT, { timezone: 'Mars/One' }, 'got "Mars/One"'],
  ['an unknown column', TEXT, { columns: { vane: 'no such' } }, 'got "no such"'],
  ['an unknown channel', TEXT, { columns: { 'no such': 'turbine' } }, 'got "no such"'],
  [
    'an unknown unit',
    TEXT,
    { columns: { wind_speed: { column: 'wind_speed', unit: 'furlong' } } },
    'got "furlong"',
  ],
  ['a time that is none', TEXT.replace('2026-03-01T00:00:00Z', 'one fine day'), {}, 'got "one fine day"'],
])('%s is quoted in the message', async (_, text, reading, expected) => {
  const { message } = await failure(staged({ 'a.csv': text }, reading))
  expect(message).toContain(expected)
})
