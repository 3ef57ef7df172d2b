import { InputError } from '../errors.ts'
import { dateReader, numberReader, type DateOrder, type StampReader } from './stamp-reader.ts'

export interface StampFormat {
  readonly reader: StampReader
  /** In words, for receipts. */
  readonly description: string
  /** The question to ask when day and month cannot be told apart in these examples; later ones may. */
  readonly doubt?: InputError
}

const DAY_MS = 86_400_000
/** Days from 1899-12-30, the zero of spreadsheets, to 1970-01-01. */
const SPREADSHEET_DAYS = 25_569
/** Seconds from 1904-01-01 to 1970-01-01. */
const SECONDS_1904 = 2_082_844_800

/**
 * Tells the format of time stamps from examples.
 *
 * @param cells  stamps of the beginning in the order of the file; blank ones are left out.
 * @param order  order of the date's parts where the caller states it.
 * @throws InputError LOG_TIME when nothing fits, or when day and month cannot be told apart
 */
export function sniffStamps(
  name: string,
  column: string,
  cells: readonly string[],
  order?: DateOrder,
): StampFormat {
  const texts = cells.filter((cell) => cell !== '')
  const first = texts[0]
  if (first === undefined) return { reader: dateReader(order ?? 'ymd'), description: 'ISO 8601' }
  const numeric = texts.filter((cell) => /^-?\d+([.,]\d+)?$/.test(cell) && !isCompactDate(cell))
  if (numeric.length * 2 > texts.length) return numberFormat(name, column, numeric)
  const candidates: readonly DateOrder[] = order ? [order] : ['ymd', 'dmy', 'mdy']
  const readable = candidates.map((one) => ({ order: one, share: readableShare(texts, one) }))
  const most = Math.max(...readable.map(({ share }) => share))
  if (!(most > 0.5)) {
    throw new InputError(
      'LOG_TIME',
      `${name} column ${column}: expected times such as 2026-03-01T00:10:00Z, 01.03.2026 00:10 or epoch milliseconds, got ${JSON.stringify(first)}`,
    )
  }
  const best = readable.filter(({ share }) => share >= most * 0.98).map((one) => one.order)
  const chosen = best.length === 1 || best.includes('ymd') ? best[0]! : dayOrMonthFirst(texts)
  if (chosen === null) {
    const doubt = new InputError(
      'LOG_TIME',
      `${name} column ${column}: is ${first} day first or month first? Both can be read; state dateOrder=dmy or dateOrder=mdy`,
      { detail: { question: 'dateOrder', answers: ['dmy', 'mdy'], example: first } },
    )
    return { reader: dateReader('dmy'), description: `written dates (such as ${first})`, doubt }
  }
  const words = { ymd: 'year-month-day', dmy: 'day-month-year', mdy: 'month-day-year' }
  return { reader: dateReader(chosen), description: `${words[chosen]} (such as ${first})` }
}

const isCompactDate = (cell: string) => /^(19|20)\d\d(0[1-9]|1[0-2])([0-2]\d|3[01])$/.test(cell)

function readableShare(texts: readonly string[], order: DateOrder): number {
  const reader = dateReader(order)
  let readable = 0
  for (const text of texts) if (!Number.isNaN(readText(reader, text))) readable++
  return readable / texts.length
}

function readText(reader: StampReader, text: string): number {
  const bytes = Buffer.from(text)
  return reader.read(bytes, 0, bytes.length)
}

/**
 * Day or month first, where every stamp of the beginning can be read both ways: dots stand for day first; else the way in
 * which the dates follow each other without jumps is taken. Null when both do.
 */
function dayOrMonthFirst(texts: readonly string[]): DateOrder | null {
  if (/^\d{1,2}\.\d{1,2}\.\d{2,4}/.test(texts[0]!)) return 'dmy'
  const dmy = largestJump(texts, 'dmy')
  const mdy = largestJump(texts, 'mdy')
  if (dmy <= 2 * DAY_MS && mdy > 20 * DAY_MS) return 'dmy'
  if (mdy <= 2 * DAY_MS && dmy > 20 * DAY_MS) return 'mdy'
  return null
}

function largestJump(texts: readonly string[], order: DateOrder): number {
  const reader = dateReader(order)
  let largest = 0
  let before = NaN
  for (const text of texts) {
    const now = readText(reader, text)
    if (Number.isNaN(now)) continue
    if (Math.abs(now - before) > largest) largest = Math.abs(now - before)
    before = now
  }
  return largest
}

/** The zero and the unit of numbers, told by their size: no two of the ranges meet between 1990 and 2100. */
function numberFormat(name: string, column: string, texts: readonly string[]): StampFormat {
  const values = texts.map((text) => Number(text.replace(',', '.'))).sort((a, b) => a - b)
  const middle = values[values.length >> 1]!
  const between = (low: number, high: number) => middle >= low && middle < high
  if (between(32_874, 73_050)) {
    const toMs = (x: number) => (x - SPREADSHEET_DAYS) * DAY_MS
    return { reader: numberReader(toMs, false), description: 'days since 1899-12-30 (spreadsheet)' }
  }
  if (between(6.3e8, 2.6e9))
    return { reader: numberReader((x) => x * 1000, true), description: 'seconds since 1970' }
  if (between(2.7e9, 6.3e9)) {
    return { reader: numberReader((x) => (x - SECONDS_1904) * 1000, true), description: 'seconds since 1904' }
  }
  if (between(6.3e11, 4.2e12))
    return { reader: numberReader((x) => x, true), description: 'milliseconds since 1970' }
  if (between(6.3e14, 4.2e15)) {
    return { reader: numberReader((x) => x / 1000, true), description: 'microseconds since 1970' }
  }
  if (between(6.3e17, 4.2e18)) {
    return { reader: numberReader((x) => x / 1e6, true), description: 'nanoseconds since 1970' }
  }
  throw new InputError(
    'LOG_TIME',
    `${name} column ${column}: expected times, got the number ${texts[0]!}, which is no count of seconds, milliseconds, microseconds or days since a usual zero`,
  )
}
