import fc from 'fast-check'
import { expect, test } from 'vitest'
import { InputError } from '../../src/errors.ts'
import { accountAddsUp, staged } from './staging.ts'

const cell = fc.oneof(
  { weight: 6, arbitrary: fc.double({ min: -30, max: 60, noNaN: true }).map((x) => x.toFixed(2)) },
  fc.constantFrom('', '-999', 'NaN', 'bad', '1,5', '9999', '"7"', '"', ' ', '1e3', '\0', 'é', '#', '\t'),
  fc.string({ maxLength: 6 }),
)

const stamp = fc.oneof(
  {
    weight: 8,
    arbitrary: fc
      .integer({ min: 0, max: 40 })
      .map((i) => new Date(Date.UTC(2026, 2, 1) + i * 600_000).toISOString()),
  },
  fc.constantFrom('', 'soon', '2026-02-30T00:00:00Z', '2026-03-01', '2026-03-01 24:00', '0'),
)

const row = fc
  .tuple(
    stamp,
    fc.constantFrom('Q01', 'Q02', 'Q01', '', 'Q/3', ' Q01 '),
    fc.array(cell, { minLength: 2, maxLength: 4 }),
  )
  .map(([time, turbine, cells]) => [time, turbine, ...cells].join(','))

const good = fc
  .integer({ min: 0, max: 40 })
  .map((i) => `${new Date(Date.UTC(2026, 2, 1) + i * 600_000).toISOString()},Q02,${i}.5,-1.5,${i * 10}`)

const table = fc.record({
  rows: fc.array(fc.oneof(row, good, good, fc.constant('')), { minLength: 1, maxLength: 40 }),
  end: fc.constantFrom('\n', '\r\n', '\r'),
  stamp: fc.constantFrom('begin' as const, 'end' as const),
  cut: fc.boolean(),
})

test('whatever the rows are, every one is accounted for, and only the caller is blamed', async () => {
  let through = 0
  await fc.assert(
    fc.asyncProperty(table, async ({ rows, end, stamp: edge, cut }) => {
      const text = ['time,turbine,wind_speed,vane,power', ...rows].join(end) + (cut ? '' : end)
      try {
        const log = await staged({ 'a.csv': text }, { stamp: edge })
        through++
        expect(accountAddsUp(log)).toBe(true)
        const keys = log.rows.map((one) => `${String(one['turbine'])} ${String(one['time']).padStart(16)}`)
        expect(keys).toEqual([...new Set(keys)].sort())
      } catch (error) {
        if (!(error instanceof InputError)) throw error
      }
    }),
    { numRuns: 40, seed: 20_260_301 },
  )
  // Most of the tables hold good rows; were all refused, nothing would have been tested.
  expect(through).toBeGreaterThan(15)
})

test('random bytes are refused by name or accounted for', async () => {
  await fc.assert(
    fc.asyncProperty(fc.uint8Array({ maxLength: 400 }), async (bytes) => {
      try {
        expect(accountAddsUp(await staged({ 'a.csv': bytes }))).toBe(true)
      } catch (error) {
        if (!(error instanceof InputError)) throw error
      }
    }),
    { numRuns: 30, seed: 7 },
  )
})
