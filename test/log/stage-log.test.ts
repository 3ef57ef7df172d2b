import { createHash } from 'node:crypto'
import { existsSync, readFileSync } from 'node:fs'
import { resolve } from 'node:path'
import { gzipSync } from 'node:zlib'
import { expect, test } from 'vitest'
import { accountAddsUp, failure, staged } from './staging.ts'

const HEAD = 'time,turbine,wind_speed,vane,power\n'
const T0 = Date.UTC(2026, 2, 1)

/** Line of a log: minute of the day, turbine, values. */
const line = (minute: number, turbine: string, ...values: (number | string)[]) =>
  `${new Date(T0 + minute * 60_000).toISOString()},${turbine},${values.join(',')}\n`

test('clean rows come out sorted by turbine and time, with the numbers as written', async () => {
  const log = await staged({
    'a.csv':
      HEAD + line(0, 'Q02', 7.1, -3.25, 900) + line(10, 'Q01', 6, 0.1, 501.5) + line(0, 'Q01', 5, 2, 499),
  })
  expect(log.rows).toEqual([
    { turbine: 'Q01', time: T0, wind_speed: 5, vane: 2, power: 499 },
    { turbine: 'Q01', time: T0 + 600_000, wind_speed: 6, vane: 0.1, power: 501.5 },
    { turbine: 'Q02', time: T0, wind_speed: 7.1, vane: -3.25, power: 900 },
  ])
  expect(log.receipt).toMatchObject({
    received: 3,
    accepted: 3,
    duplicate: 0,
    rejected: 0,
    intervalS: 600,
    first: '2026-03-01T00:00:00.000Z',
    last: '2026-03-01T00:10:00.000Z',
    turbines: [
      { turbine: 'Q01', rows: 2 },
      { turbine: 'Q02', rows: 1 },
    ],
    warnings: [],
  })
  expect(log.channels).toEqual(['wind_speed', 'vane', 'power'])
})

test('the last of two rows with the same turbine and time wins, over files too', async () => {
  const log = await staged({
    'a.csv': HEAD + line(0, 'Q01', 5, 1, 100) + line(10, 'Q01', 5, 2, 100) + line(0, 'Q01', 5, 3, 100),
    'b.csv': HEAD + line(10, 'Q01', 5, 4, 100) + line(20, 'Q01', 5, 5, 100),
  })
  expect(log.rows.map((row) => row['vane'])).toEqual([3, 4, 5])
  expect(log.receipt).toMatchObject({ received: 5, accepted: 3, duplicate: 2, rejected: 0 })
  expect(accountAddsUp(log)).toBe(true)
})

test('a rejected row never overrules a good one', async () => {
  const log = await staged({ 'a.csv': HEAD + line(0, 'Q01', 5, 1, 100) + line(0, 'Q01', '', '', '') })
  expect(log.rows).toHaveLength(1)
  expect(log.receipt).toMatchObject({ received: 2, accepted: 1, duplicate: 0, rejected: 1 })
})

test('every rejected row is kept with its line number, reason and text', async () => {
  const text =
    '# made by hand\n' +
    HEAD +
    line(0, 'Q01', 5, 1, 100) +
    '\n' +
    '2026-03-01T00:10:00Z,Q01,5,1\n' +
    '2026-03-01T00:20:00Z,"Q01,5,1,100\n' +
    ',Q01,5,1,100\n' +
    'yesterday,Q01,5,1,100\n' +
    '2026-03-01T00:30:00Z,,5,1,100\n' +
    '2026-03-01T00:40:00Z,Q01,,,\n' +
    '2026-03-01T00:50:00Z,Q/1,5,1,100\n' +
    '2026-03-01T01:00:00Z,Q01,5\0,1,100\n' +
    line(70, 'Q01', 5, 1, 100)
  const log = await staged({ 'a.csv': text })
  const reasons = log.receipt.rejectedByReason.map(({ reason, rows, firstLine }) => [reason, rows, firstLine])
  expect(reasons).toEqual([
    ['field-count', 1, 5],
    ['quote', 1, 6],
    ['no-time', 1, 7],
    ['bad-time', 1, 8],
    ['no-turbine', 1, 9],
    ['bad-turbine', 1, 11],
    ['not-text', 1, 12],
    ['no-values', 1, 10],
  ])
  expect(log.receipt).toMatchObject({ received: 10, accepted: 2, duplicate: 0, rejected: 8, blankLines: 1 })
  expect(log.rejected?.split('\n').slice(0, 4)).toEqual([
    'file,line,reason,text',
    'a.csv,5,field-count,"2026-03-01T00:10:00Z,Q01,5,1"',
    'a.csv,6,quote,"2026-03-01T00:20:00Z,""Q01,5,1,100"',
    'a.csv,7,no-time,",Q01,5,1,100"',
  ])
  expect(accountAddsUp(log)).toBe(true)
})

test('unreadable cells, cells outside limits and words for nothing are missing, and told apart', async () => {
  const values = ['5', 'NaN', 'bad', '-999', '', '9999', 'null', '6', '7', 'inf', '5', '5', '5', '5']
  const text = HEAD + values.map((value, i) => line(i * 10, 'Q01', value, 1, 100)).join('')
  const log = await staged({ 'a.csv': text })
  expect(log.rows.map((row) => row['wind_speed'])).toEqual([
    5,
    null,
    null,
    null,
    null,
    null,
    null,
    6,
    7,
    null,
    5,
    5,
    5,
    5,
  ])
  const column = log.receipt.columns.find(({ takenFor }) => takenFor === 'wind_speed')
  expect(column).toMatchObject({ unreadable: 1, outOfRange: 3, missing: 7 })
  expect(log.receipt.columns.find(({ takenFor }) => takenFor === 'vane')).toMatchObject({ missing: 0 })
})

test('a column in which most cells are no numbers is refused with the place and the text', async () => {
  const text = HEAD + line(0, 'Q01', 5, 'left', 1) + line(10, 'Q01', 5, 'right', 1) + line(20, 'Q01', 5, 3, 1)
  const { code, message } = await failure(staged({ 'a.csv': text }))
  expect(code).toBe('LOG_COLUMN_UNREADABLE')
  expect(message).toContain('column vane')
  expect(message).toContain('line 2: left')
})

test('quoted fields with delimiters, doubled quotes and late quotes are read as they are', async () => {
  const head = 'time,turbine,status,"wind_speed"\n'
  const rows = [
    '2026-03-01T00:00:00Z,Q01,"run, free",5\n',
    '2026-03-01T00:10:00Z,"Q01","say ""go""",6\n',
    '2026-03-01T00:20:00Z,Q01,run,7\n',
  ]
  const log = await staged({ 'a.csv': head + rows.join('') })
  expect(log.rows.map((row) => row['status'])).toEqual(['run, free', 'say "go"', 'run'])
  expect(log.rows.map((row) => row['wind_speed'])).toEqual([5, 6, 7])

  // Quotes that come after the beginning that the sniffer sees: the log is read again with a safe delimiter.
  const many = Array.from({ length: 12_000 }, (_, i) => line(i * 10, 'Q01', 'run', 5)).join('')
  const late = await staged({
    'a.csv': 'time,turbine,status,wind_speed\n' + many + line(120_000, 'Q01', '"stop, wind"', 3),
  })
  expect(late.receipt).toMatchObject({ received: 12_001, accepted: 12_001, rejected: 0 })
  expect(late.rows.at(-1)).toMatchObject({ status: 'stop, wind', wind_speed: 3 })
})

test('units named in header or map are converted, canonical ones are kept to the last digit', async () => {
  const text =
    'time,turbine,Wind Speed (km/h),"Active Power [MW]",Ambient Temp (K),Yaw error,p\n' +
    '2026-03-01T00:00:00Z,Q01,36,1.5,283.15,0.1,99000\n'
  const log = await staged(
    { 'a.csv': text },
    { columns: { air_pressure: { column: 'p', unit: 'Pa' }, vane: { column: 'Yaw error', unit: 'rad' } } },
  )
  expect(log.rows[0]).toMatchObject({ wind_speed: 10, power: 1500, air_temperature: 10, air_pressure: 990 })
  expect(log.rows[0]?.['vane']).toBeCloseTo(18 / Math.PI, 12)
  const power = log.receipt.columns.find(({ takenFor }) => takenFor === 'power')
  expect(power).toMatchObject({ column: 'Active Power [MW]', unit: 'MW' })
})

test('a power in watts without a stated unit is refused, and told how to state it', async () => {
  const text =
    HEAD + Array.from({ length: 100 }, (_, i) => line(i * 10, 'Q01', 8, 1, 200_000 + i * 9000)).join('')
  const { code, message } = await failure(staged({ 'a.csv': text }))
  expect(code).toBe('LOG_UNIT')
  expect(message).toContain('columns={"power":{"column":"power","unit":"W"}}')
  const log = await staged({ 'a.csv': text }, { columns: { power: { column: 'power', unit: 'W' } } })
  expect(log.rows[1]?.['power']).toBe(209)
})

test('a sentinel above the limit of power is no sign of watts', async () => {
  const text =
    HEAD + Array.from({ length: 100 }, (_, i) => line(i * 10, 'Q01', 8, 1, i % 3 ? 500 : 65_535)).join('')
  const log = await staged({ 'a.csv': text })
  expect(log.receipt.columns.find(({ takenFor }) => takenFor === 'power')).toMatchObject({ outOfRange: 34 })
})

test('stamps at the end of the interval are moved to its start, by each turbine its own interval', async () => {
  const text =
    HEAD +
    [10, 20, 30].map((m) => line(m, 'Q01', 5, 1, 1)).join('') +
    [5, 10, 15, 20].map((m) => line(m, 'Q02', 5, 1, 1)).join('')
  const log = await staged({ 'a.csv': text }, { stamp: 'end' })
  expect(log.rows.map((row) => [row['turbine'], (Number(row['time']) - T0) / 60_000])).toEqual([
    ['Q01', 0],
    ['Q01', 10],
    ['Q01', 20],
    ['Q02', 0],
    ['Q02', 5],
    ['Q02', 10],
    ['Q02', 15],
  ])
})

test('a log without a column of turbines takes its name from the request, else from the file', async () => {
  const text = 'time,wind_speed\n2026-03-01T00:00:00Z,5\n'
  const byFile = await staged({ 'logs/Q07.csv.gz': gzipSync(text) })
  expect(byFile.rows[0]?.['turbine']).toBe('Q07')
  expect(byFile.receipt.warnings.join()).toContain('named by the file name')
  const byRequest = await staged({ 'Q07.csv': text }, { turbine: 'K3' })
  expect(byRequest.rows[0]?.['turbine']).toBe('K3')
})

test('gzip is told by its bytes, hashed as sent, and a broken one is refused', async () => {
  const text = HEAD + Array.from({ length: 3000 }, (_, i) => line(i * 10, 'Q01', i % 20, 1, i)).join('')
  const sent = gzipSync(text)
  const log = await staged({ 'a.csv': sent })
  expect(log.receipt.accepted).toBe(3000)
  expect(log.receipt.inputs[0]?.sha256).toBe(createHash('sha256').update(sent).digest('hex'))
  for (const broken of [sent.subarray(0, sent.length - 5), sent.subarray(0, 100)]) {
    expect((await failure(staged({ 'a.csv.gz': broken }))).code).toBe('LOG_CORRUPT')
  }
})

test('what is no log is refused with a code of its own', async () => {
  const good = line(0, 'Q01', 5, 1, 100)
  expect((await failure(staged({ 'a.csv': '' }))).code).toBe('LOG_EMPTY')
  expect((await failure(staged({ 'a.csv': ' \n\n' }))).code).toBe('LOG_EMPTY')
  expect((await failure(staged({ 'a.csv': good + good }))).code).toBe('LOG_NO_HEADER')
  expect((await failure(staged({ 'a.csv': HEAD }))).code).toBe('LOG_NO_ROWS')
  expect((await failure(staged({ 'a.csv': 'a,b,c\n1,2,3\n' }))).code).toBe('LOG_COLUMNS_MISSING')
  expect((await failure(staged({ 'a.csv': 'time,b,c\n2026-03-01,2,3\n' }))).code).toBe('LOG_COLUMNS_MISSING')
  expect((await failure(staged({ 'a.csv': HEAD + good }, { timezone: 'Mars/Base' }))).code).toBe('BAD_OPTION')
  expect((await failure(staged({ 'a.csv': HEAD + good }, { columns: { vane: 'no' } }))).code).toBe(
    'LOG_COLUMN_MAP',
  )
  expect((await failure(staged({ 'a.csv': HEAD + good }, { columns: { no: 'vane' } }))).code).toBe(
    'LOG_COLUMN_MAP',
  )
  expect((await failure(staged({ 'a.csv': HEAD + good }, {}, { maxDecompressedBytes: 20 }))).code).toBe(
    'LOG_TOO_LARGE',
  )
  expect((await failure(staged({ 'a.csv': HEAD + good }, {}, { maxColumns: 4 }))).code).toBe(
    'LOG_TOO_MANY_COLUMNS',
  )
  expect((await failure(staged({ 'a.csv': HEAD + good + good }, {}, { maxRows: 1 }))).code).toBe(
    'LOG_TOO_MANY_ROWS',
  )
  const bad = HEAD + 'monday,Q01,5,1,1\ntuesday,Q01,5,1,1\n'
  expect((await failure(staged({ 'a.csv': bad }))).code).toBe('LOG_TIME')
})

test('a line of 50 MB is refused with its number', async () => {
  const text = HEAD + line(0, 'Q01', 5, 1, 100) + 'x'.repeat(50_000_000) + '\n'
  const { code, message } = await failure(staged({ 'a.csv': text }))
  expect(code).toBe('LOG_LINE_TOO_LONG')
  expect(message).toContain('line 3')
  // The limit itself is met to the byte.
  const fits = HEAD + line(0, 'Q01', 5, 1, `1${' '.repeat(100)}`)
  const longest = Math.max(...fits.split('\n').map((one) => one.length))
  expect((await staged({ 'a.csv': fits }, {}, { maxLineBytes: longest })).receipt.accepted).toBe(1)
  expect((await failure(staged({ 'a.csv': fits }, {}, { maxLineBytes: longest - 1 }))).code).toBe(
    'LOG_LINE_TOO_LONG',
  )
})

const sdwpf = resolve(import.meta.dirname, '../../../shared/data/sdwpf-two-days.csv')

test.skipIf(!existsSync(sdwpf))(
  'two days of 134 turbines with day number and clock (skipped where ../shared is absent)',
  async () => {
    const log = await staged(
      { 'sdwpf.csv': readFileSync(sdwpf) },
      {
        startDate: '2020-05-01',
        columns: {
          turbine: 'TurbID',
          wind_speed: 'Wspd',
          vane: 'Wdir',
          air_temperature: 'Etmp',
          nacelle_position: 'Ndir',
          pitch: 'Pab1',
          power: 'Patv',
        },
      },
    )
    // Counts of the file as its README gives them: 38,592 rows, 160 of them blank but for their keys, 134 turbines.
    expect(log.receipt).toMatchObject({
      received: 38_592,
      accepted: 38_432,
      duplicate: 0,
      rejected: 160,
      intervalS: 600,
    })
    expect(log.receipt.rejectedByReason).toMatchObject([{ reason: 'no-values', rows: 160, firstLine: 2 }])
    expect(log.receipt.turbines).toHaveLength(134)
    expect(log.receipt.last).toBe('2020-05-02T23:50:00.000Z')
    const turns = log.rows.map((row) => Number(row['nacelle_position']))
    expect(Math.min(...turns)).toBeLessThan(-380)
    expect(Math.max(...turns)).toBeGreaterThan(580)
    expect(Math.min(...log.rows.map((row) => Number(row['power'])))).toBeLessThan(0)
    const outside = log.receipt.columns.find(({ takenFor }) => takenFor === 'air_temperature')?.outOfRange
    expect(outside).toBeGreaterThan(0)
    expect(accountAddsUp(log)).toBe(true)
  },
)
