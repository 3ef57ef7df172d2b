import { gzipSync } from 'node:zlib'
import fc from 'fast-check'
import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import { AlikeScanner } from '../../src/log/alike-lines.ts'
import { RowScanner } from '../../src/log/row-scanner.ts'
import type { LogReading } from '../../src/log/index.ts'
import { accountAddsUp, failure, staged, type Staged } from './staging.ts'

const T0 = Date.UTC(2026, 2, 1)

const quick = vi.spyOn(AlikeScanner.prototype, 'read')
const careful = vi.spyOn(RowScanner.prototype, 'write')
beforeEach(() => {
  quick.mockClear()
  careful.mockClear()
})
afterEach(() => {
  vi.clearAllMocks()
})

/** A log that was sent as gzip is always read line by line: it tells what the same text has to give. */
async function lineByLine(text: string | Buffer, reading: LogReading): Promise<Staged> {
  quick.mockClear()
  const log = await staged({ 'a.csv': gzipSync(text) }, reading)
  expect(quick).not.toHaveBeenCalled()
  careful.mockClear()
  return log
}

/** Everything but the checksum of what was sent. */
function content({ receipt, ...rest }: Staged) {
  return { ...rest, receipt: { ...receipt, inputs: receipt.inputs.map(({ rows }) => rows) } }
}

const stampForms = {
  zulu: (ms: number) => new Date(ms).toISOString().replace('.000Z', 'Z'),
  blank: (ms: number) => new Date(ms).toISOString().slice(0, 19).replace('T', ' '),
  decimals: (ms: number) => new Date(ms).toISOString(),
  plainDecimals: (ms: number) => new Date(ms).toISOString().slice(0, 23).replace('T', ' '),
}

const cell = fc.oneof(
  { weight: 20, arbitrary: fc.double({ min: -20, max: 60, noNaN: true }).map((x) => x.toFixed(2)) },
  fc.constantFrom(
    '',
    ' 7 ',
    'NaN',
    'bad',
    '-999',
    '9999',
    '1e1',
    '1_0',
    '+5',
    '.5',
    '5.',
    'inf',
    '--',
    '0x10',
    '1,5',
  ),
)
const table = fc.record({
  form: fc.constantFrom(...(Object.keys(stampForms) as (keyof typeof stampForms)[])),
  lineEnd: fc.constantFrom('\n', '\r\n'),
  delimiter: fc.constantFrom(';', '\t', '|'),
  stampAt: fc.integer({ min: 0, max: 3 }),
  turbines: fc.array(fc.constantFrom('Q01', 'Q02', ' Q03', 'Q04 ', 'Öst'), { minLength: 1, maxLength: 3 }),
  order: fc.constantFrom('sorted', 'by time', 'shuffled', 'repeated'),
  timezone: fc.constantFrom(undefined, 'Europe/Berlin'),
  stamp: fc.constantFrom(undefined, 'end' as const),
  lastLineEnd: fc.boolean(),
  mark: fc.boolean(),
  cells: fc.array(fc.tuple(cell, cell, fc.constantFrom('run', 'stop', ' wait ', '', 'läuft')), {
    minLength: 20,
    maxLength: 60,
  }),
})

test('a table of alike lines gives the same rows and the same receipt as read line by line', async () => {
  let alike = 0
  await fc.assert(
    fc.asyncProperty(table, async (t) => {
      const rows = t.cells.map((cells, i) => {
        const turbine = t.turbines[i % t.turbines.length]!
        const step = Math.floor(i / t.turbines.length)
        return { turbine, ms: T0 + (t.order === 'repeated' ? step >> 1 : step) * 60_000 + 30_000, cells }
      })
      if (t.order === 'sorted')
        rows.sort((a, b) => Buffer.compare(Buffer.from(a.turbine), Buffer.from(b.turbine)))
      if (t.order === 'shuffled') rows.reverse()
      const line = (stamp: string, others: readonly string[]) =>
        [...others.slice(0, t.stampAt), stamp, ...others.slice(t.stampAt)].join(t.delimiter)
      const lines = [
        line('time', ['turbine', 'wind_speed', 'power', 'status']),
        ...rows.map(({ turbine, ms, cells }) => line(stampForms[t.form](ms), [turbine, ...cells])),
      ]
      const text = (t.mark ? '\ufeff' : '') + lines.join(t.lineEnd) + (t.lastLineEnd ? t.lineEnd : '')
      const reading: LogReading = {
        ...(t.timezone ? { timezone: t.timezone } : {}),
        ...(t.stamp ? { stamp: t.stamp } : {}),
      }
      const refusal = await failure(staged({ 'a.csv': gzipSync(text) }, reading))
      if (refusal.code !== 'none') {
        expect(await failure(staged({ 'a.csv': text }, reading))).toEqual(refusal)
        return
      }
      const expected = await lineByLine(text, reading)
      const log = await staged({ 'a.csv': text }, reading)
      expect(content(log)).toEqual(content(expected))
      expect(accountAddsUp(log)).toBe(true)
      expect(quick).toHaveBeenCalledTimes(1)
      if (careful.mock.calls.length === 0) alike++
    }),
    // A fixed seed, since the check below counts how many of the tables were alike.
    { numRuns: 30, seed: 20240331 },
  )
  expect(alike).toBeGreaterThan(10)
})

const HEAD = 'time,turbine,wind_speed,vane,power\n'
const row = (i: number) =>
  `${new Date(T0 + i * 1000).toISOString().slice(0, 19)}Z,Q01,${(i % 200) / 10},${(i % 7) - 3},${i % 1000}\n`
const many = (from: number, to: number) => Array.from({ length: to - from }, (_, i) => row(from + i)).join('')

test.each([
  ['a quoted field', '"2026-03-01T05:00:00Z","Q01",5,1,100\n'],
  ['an open quote', '2026-03-01T05:00:00Z,"Q01,5,1,100\n'],
  ['a field too few', '2026-03-01T05:00:00Z,Q01,5,1\n'],
  ['a field too many', '2026-03-01T05:00:00Z,Q01,5,1,100,\n'],
  ['a blank line', '\n'],
  ['a line of blanks', '   \n'],
  ['a CRLF line end', '2026-03-01T05:00:00Z,Q01,5,1,100\r\n'],
  ['a lone CR', '2026-03-01T05:00:00Z,Q01,5,1,100\r2026-03-01T05:00:01Z,Q01,5,1,100\n'],
  ['a NUL', '2026-03-01T05:00:00Z,Q01,5\0,1,100\n'],
  ['a field separator', '2026-03-01T05:00:00Z,Q01,5\u001f,1,100\n'],
  ['a comment', '# restarted\n'],
  ['a second header', HEAD],
  ['a time in another form', '2026-03-01 05:00:00,Q01,5,1,100\n'],
  ['a time with an offset', '2026-03-01T05:00:00+01:00,Q01,5,1,100\n'],
  ['the end of the day as 24:00', '2026-03-01T24:00:00Z,Q01,5,1,100\n'],
  ['a day that does not exist', '2026-02-30T05:00:00Z,Q01,5,1,100\n'],
  ['a second 60', '2026-03-01T04:59:60Z,Q01,5,1,100\n'],
  ['no time', ',Q01,5,1,100\n'],
  ['no turbine', '2026-03-01T05:00:00Z,,5,1,100\n'],
  ['a turbine that cannot be addressed', '2026-03-01T05:00:00Z,Q/1,5,1,100\n'],
  ['a line that is no UTF-8', Buffer.from('2026-03-01T05:00:00Z,K\xf6hn,5,1,100\n', 'latin1')],
])('behind 500 kB of alike lines %s sends the log to the reading line by line', async (_, fault) => {
  const text = Buffer.concat(
    [HEAD + many(0, 12_000), fault, many(18_001, 20_000)].map((one) => Buffer.from(one)),
  )
  const expected = await lineByLine(text, {})
  const log = await staged({ 'a.csv': text })
  expect(quick).toHaveBeenCalledTimes(1)
  expect(careful).toHaveBeenCalled()
  expect(content(log)).toEqual(content(expected))
  expect(accountAddsUp(log)).toBe(true)
})

test.each([
  ['rows without any value', '2026-03-01T05:00:00Z,Q01,,,\n'.repeat(2), {}],
  ['cells that are no numbers', '2026-03-01T05:00:00Z,Q01,bad,1,100\n', {}],
  ['cells outside limits', '2026-03-01T05:00:00Z,Q01,-999,1,100\n', {}],
  ['rows that come twice', '2026-03-01T03:00:00Z,Q01,5,1,100\n2026-03-01T03:00:00Z,Q01,,,\n', {}],
  ['rows out of order', '2026-02-28T00:00:00Z,Q01,5,1,100\n', {}],
  ['a turbine that comes back', '2026-03-01T05:00:00Z,Q00,5,1,100\n', {}],
  ['stamps at the end of the interval', '2026-03-01T05:00:00Z,Q01,5,1,100\n', { stamp: 'end' }],
])('behind 500 kB of alike lines %s are found without reading line by line', async (_, odd, reading) => {
  const text = HEAD + many(0, 12_000) + odd + many(18_001, 20_000)
  const expected = await lineByLine(text, reading as LogReading)
  const log = await staged({ 'a.csv': text }, reading as LogReading)
  expect(careful).not.toHaveBeenCalled()
  expect(content(log)).toEqual(content(expected))
  expect(accountAddsUp(log)).toBe(true)
})

test('line numbers hold in a log of several read buffers', async () => {
  // A read buffer of DuckDB holds 32 MB: the empty row lies in the second one.
  const head = 'time,turbine,status,wind_speed\n'
  const filler = 'x'.repeat(1000)
  const lines = Array.from(
    { length: 60_000 },
    (_, i) => `${new Date(T0 + i * 1000).toISOString()},Q01,${filler},${i % 20}\n`,
  )
  lines[49_998] = `${new Date(T0 + 49_998_000).toISOString()},Q01,,\n`
  lines[55_555] = `${new Date(T0 + 55_555_000).toISOString()},Q01,run,calm\n`
  const log = await staged({ 'a.csv': head + lines.join('') })
  expect(careful).not.toHaveBeenCalled()
  expect(log.receipt.rejectedByReason).toEqual([
    { reason: 'no-values', rows: 1, firstLine: 50_000, firstText: lines[49_998].trim() },
  ])
  expect(log.rows.at(-1)).toMatchObject({ time: T0 + 59_999_000, wind_speed: 59_999 % 20 })
  expect(log.receipt.columns.find(({ takenFor }) => takenFor === 'wind_speed')).toMatchObject({
    unreadable: 1,
  })
})

test('in local time a change of the clock sends the log to the reading line by line', async () => {
  const lines = (fromUtc: number) =>
    Array.from({ length: 400 }, (_, i) => {
      const wall = new Intl.DateTimeFormat('sv-SE', {
        timeZone: 'Europe/Berlin',
        dateStyle: 'short',
        timeStyle: 'medium',
      }).format(fromUtc + i * 60_000)
      return `${wall},Q01,5,1,100\n`
    }).join('')
  // The clock went back on 25 October 2026 at 01:00 UTC (tz database, Europe/Berlin).
  const change = HEAD + lines(Date.UTC(2026, 9, 24, 22))
  const log = await staged({ 'a.csv': change }, { timezone: 'Europe/Berlin' })
  expect(careful).toHaveBeenCalled()
  expect(log.receipt).toMatchObject({ accepted: 400, duplicate: 0, first: '2026-10-24T22:00:00.000Z' })
  careful.mockClear()
  const plain = await staged(
    { 'a.csv': HEAD + lines(Date.UTC(2026, 9, 20, 22)) },
    { timezone: 'Europe/Berlin' },
  )
  expect(careful).not.toHaveBeenCalled()
  expect(plain.receipt).toMatchObject({ accepted: 400, duplicate: 0, first: '2026-10-20T22:00:00.000Z' })
})

test('a checksum that the caller has already is kept', async () => {
  const text = HEAD + many(0, 100)
  const log = await staged({ 'a.csv': text }, {}, {}, { 'a.csv': 'c0ffee' })
  expect(log.receipt.inputs).toEqual([{ name: 'a.csv', sha256: 'c0ffee', rows: 100 }])
})
