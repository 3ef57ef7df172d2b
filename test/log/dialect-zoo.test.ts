import { DateTime } from 'luxon'
import { gzipSync } from 'node:zlib'
import { expect, test } from 'vitest'
import type { LogReading } from '../../src/log/index.ts'
import { accountAddsUp, failure, staged } from './staging.ts'

interface Row {
  ms: number
  wind: string
  vane: string
  power: string
  nacelle: string
}

const ZONE = 'Europe/Berlin'
const START = DateTime.fromISO('2026-03-01', { zone: ZONE }).toMillis()

/** A month of ten-minute rows of one turbine with a daylight saving change in it; numbers as text, so that bits can be compared. */
const ROWS: Row[] = Array.from({ length: 4458 }, (_, i) => ({
  ms: START + i * 600_000,
  wind: (8 + 4 * Math.sin(i / 37)).toFixed(3),
  vane: (6 * Math.sin(i * 1.7) - 1).toFixed(2),
  power: (900 + 800 * Math.sin(i / 37)).toFixed(1),
  nacelle: ((i * 7.3) % 360).toFixed(1),
}))

const EXPECTED = ROWS.map((row) => ({
  turbine: 'Q01',
  time: row.ms,
  wind_speed: Number(row.wind),
  vane: Number(row.vane),
  nacelle_position: Number(row.nacelle),
  power: Number(row.power),
}))

const iso = (ms: number) => new Date(ms).toISOString()
const local = (ms: number, format: string) =>
  DateTime.fromMillis(ms, { zone: ZONE }).toFormat(format, { locale: 'en' })

/** A delimited text. `comma`: decimal comma. */
function text(
  header: string[],
  time: (ms: number) => string,
  options: {
    delimiter?: string
    comma?: boolean
    end?: string
    quote?: boolean
    before?: string
    after?: string
  } = {},
): string {
  const { delimiter = ',', comma = false, end = '\n', quote = false, before = '', after = '' } = options
  const number = (x: string) => (comma ? x.replace('.', ',') : x)
  const cell = (x: string) => (quote ? `"${x}"` : x)
  const lines = ROWS.map((row) =>
    [time(row.ms), 'Q01', ...[row.wind, row.vane, row.nacelle, row.power].map(number)]
      .map(cell)
      .join(delimiter),
  )
  return before + [header.map(cell).join(delimiter), ...lines].join(end) + end + after
}

const PLAIN = ['time', 'turbine', 'wind_speed', 'vane', 'nacelle_position', 'power']
const SPOKEN = [
  'Date and time',
  'Turbine',
  'Wind speed (m/s)',
  'Wind direction relative [°]',
  'Nacelle position (°)',
  'Power (kW)',
]
const IEC = ['time', 'turbine', 'WMET.HorWdSpd', 'Yaw error', 'WNAC.Dir', 'WTUR.W']
const AVERAGES = [
  'Timestamp',
  'WTG',
  'WindSpeed_avg',
  'RelativeWindDirection_Avg',
  'NacelleDirection_mean',
  'ActivePower Average',
]

const utf16 = (s: string, bigEndian: boolean, mark: boolean) => {
  const bytes = Buffer.from((mark ? '\ufeff' : '') + s, 'utf16le')
  return bigEndian ? bytes.swap16() : bytes
}

const BERLIN = { timezone: ZONE }

const DIALECTS: Record<string, [string | Uint8Array, LogReading?]> = {
  'ISO 8601 with Z': [text(PLAIN, iso)],
  'ISO 8601 with local offset': [text(PLAIN, (ms) => DateTime.fromMillis(ms, { zone: ZONE }).toISO()!)],
  'local time with zone given': [text(PLAIN, (ms) => local(ms, 'yyyy-MM-dd HH:mm:ss')), BERLIN],
  tabs: [text(PLAIN, iso, { delimiter: '\t' })],
  bars: [text(SPOKEN, iso, { delimiter: '|' })],
  'semicolons and decimal comma': [text(PLAIN, iso, { delimiter: ';', comma: true })],
  'semicolons, decimal comma, day.month.year': [
    text(SPOKEN, (ms) => local(ms, 'dd.MM.yyyy HH:mm'), { delimiter: ';', comma: true }),
    BERLIN,
  ],
  'tabs, decimal comma, seconds with fraction': [
    text(PLAIN, (ms) => local(ms, "dd/MM/yyyy HH:mm:ss'.000'"), { delimiter: '\t', comma: true }),
    BERLIN,
  ],
  'commas, decimal comma, all quoted': [
    text(['Date, time', ...PLAIN.slice(1)], iso, { quote: true, comma: true }),
    { columns: { time: 'Date, time' } },
  ],
  'everything quoted': [text(SPOKEN, iso, { quote: true })],
  'month first with AM and PM': [text(PLAIN, (ms) => local(ms, 'M/d/yyyy h:mm a')), BERLIN],
  'day first, two-digit year': [text(PLAIN, (ms) => local(ms, 'dd/MM/yy HH:mm')), BERLIN],
  'month by name': [text(PLAIN, (ms) => local(ms, 'dd-LLL-yyyy HH:mm:ss')), BERLIN],
  'compact date': [text(PLAIN, (ms) => local(ms, "yyyyMMdd'T'HHmm")), BERLIN],
  'year/month/day': [text(PLAIN, (ms) => local(ms, 'yyyy/MM/dd HH:mm')), BERLIN],
  '24:00 for the end of the day': [
    text(PLAIN, (ms) => {
      const shown = local(ms + 600_000, 'yyyy-MM-dd HH:mm')
      return shown.endsWith('00:00') ? `${local(ms, 'yyyy-MM-dd')} 24:00` : shown
    }),
    { ...BERLIN, stamp: 'end' },
  ],
  'epoch seconds': [text(PLAIN, (ms) => String(ms / 1000))],
  'epoch milliseconds': [text(PLAIN, String)],
  'epoch microseconds': [text(PLAIN, (ms) => `${ms}000`)],
  'seconds since 1904': [text(PLAIN, (ms) => `${ms / 1000 + 2_082_844_800}.000`)],
  'spreadsheet days': [text(PLAIN, (ms) => String(ms / 86_400_000 + 25_569))],
  'UTF-8 with byte-order mark': ['\ufeff' + text(PLAIN, iso)],
  'UTF-16 little endian with mark': [utf16(text(SPOKEN, iso), false, true)],
  'UTF-16 big endian with mark': [utf16(text(SPOKEN, iso), true, true)],
  'UTF-16 little endian without mark': [utf16(text(PLAIN, iso), false, false)],
  'Latin-1 degree signs': [Buffer.from(text(SPOKEN, iso), 'latin1')],
  CRLF: [text(PLAIN, iso, { end: '\r\n' })],
  'lone CR': [text(PLAIN, iso, { end: '\r' })],
  'CR CR LF': [text(PLAIN, iso, { end: '\r\r\n' })],
  'preamble, header behind #, blank lines at the end': [
    text(PLAIN, iso, { before: '# made by hand\n#\n# site: Quern Hill, 3 turbines\n# ', after: '\n\n \n' }),
  ],
  'preamble without #': [text(PLAIN, iso, { before: 'Report of the month\n\nSite;Quern Hill\n' })],
  'a delimiter at the end of data lines': [text(PLAIN, iso).replace(/(\d)\n/g, '$1,\n')],
  'names of IEC 61400-25': [text(IEC, iso)],
  'names of IEC 61400-25 with underscore': [
    text(
      IEC.map((name) => name.replace('.', '_')),
      iso,
    ),
  ],
  'names marked as averages': [text(AVERAGES, iso)],
  gzip: [gzipSync(text(PLAIN, iso))],
  'date and clock in two columns': [
    text(['Date', 'Time', ...PLAIN.slice(1)], (ms) => local(ms, 'dd.MM.yyyy,HH:mm:ss')),
    BERLIN,
  ],
  'interval ends': [text(PLAIN, (ms) => iso(ms + 600_000)), { stamp: 'end' }],
  'blanks around cells': [text(PLAIN, iso).replaceAll(',', ' , ')],
  'units in other words': [
    text(
      ['time', 'turbine', 'wind speed m/s', 'yaw error deg', 'nacelle direction [degrees]', 'power_kw'],
      iso,
    ),
  ],
}

test('one month of one turbine in every dialect gives the same rows, bit for bit', async () => {
  expect(Object.keys(DIALECTS).length).toBeGreaterThanOrEqual(20)
  for (const [name, [bytes, reading]] of Object.entries(DIALECTS)) {
    const log = await staged({ 'Q01.csv': bytes }, reading).catch((error: unknown) => String(error))
    if (typeof log === 'string') expect.fail(`${name}: ${log}`)
    expect(log.receipt, name).toMatchObject({
      received: 4458,
      accepted: 4458,
      duplicate: 0,
      rejected: 0,
      intervalS: 600,
    })
    expect(log.rows, name).toEqual(EXPECTED)
    expect(accountAddsUp(log), name).toBe(true)
  }
})

test('a file whose days all could be months is refused with the question to answer', async () => {
  const line = (i: number) => `01/02/2026 00:${String(i * 10).padStart(2, '0')},Q01,5`
  const body = `time,turbine,power\n${[0, 1, 2, 3].map(line).join('\n')}\n`
  const { code, message } = await failure(staged({ 'a.csv': body }))
  expect(code).toBe('LOG_TIME')
  expect(message).toContain('day first or month first')
  const dmy = await staged({ 'a.csv': body }, { dateOrder: 'dmy' })
  expect(dmy.receipt.first).toBe('2026-02-01T00:00:00.000Z')
  const mdy = await staged({ 'a.csv': body }, { dateOrder: 'mdy' })
  expect(mdy.receipt.first).toBe('2026-01-02T00:00:00.000Z')
})

test('day and month are told apart by a later line, beyond the beginning of the file too', async () => {
  const lines: string[] = []
  for (const day of ['01/02/2026', '13/02/2026']) {
    for (let turbine = 0; turbine < 9000; turbine++) lines.push(`${day} 00:00,T${turbine},5`)
  }
  const log = await staged({ 'a.csv': `time,turbine,power\n${lines.join('\n')}\n` })
  expect(log.receipt.first).toBe('2026-02-01T00:00:00.000Z')
  expect(log.receipt.last).toBe('2026-02-13T00:00:00.000Z')
})

test('thousands separators are never guessed', async () => {
  const body = (cells: string[]) => cells.map((cell, i) => `2026-03-01 0${i}:00;Q01;${cell};7,5`).join('\n')
  const log = await staged({
    'a.csv': `time;turbine;power;wind_speed\n${body(['1.234', '234,5', '1.234,5', '900', '901', '902'])}\n`,
  })
  expect(log.rows.map((row) => row['power'])).toEqual([null, 234.5, null, 900, 901, 902])
  expect(log.receipt.columns.find(({ takenFor }) => takenFor === 'power')).toMatchObject({ unreadable: 2 })
})
