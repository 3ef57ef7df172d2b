/** Order of the parts of a date. */
export type DateOrder = 'ymd' | 'dmy' | 'mdy'

/** Reads time stamps from bytes. The answer stands in fields, because a stamp is read per row and nothing may be allocated. */
export interface StampReader {
  /** Epoch ms of an instant, or of a wall clock as if it were UTC (then `zoned` is false). NaN = unreadable. */
  read(bytes: Uint8Array, from: number, to: number): number
  /** Whether the last stamp stated its offset. */
  readonly zoned: boolean
}

const MONTHS = ['jan', 'feb', 'mar', 'apr', 'may', 'jun', 'jul', 'aug', 'sep', 'oct', 'nov', 'dec']
const DAY_MS = 86_400_000
const [COLON, DOT, COMMA, MINUS, PLUS, SLASH] = [0x3a, 0x2e, 0x2c, 0x2d, 0x2b, 0x2f]

/**
 * Reader of written dates: `2026-03-01T00:10:00Z`, `01.03.2026 00:10`, `3/1/2026 12:10 AM`, `20260301 0010`, `01-Mar-2026`.
 * Year first is recognised by its four digits whatever `order` says. 24:00 is the end of the day. Two-digit years are 20xx.
 */
export function dateReader(order: DateOrder): StampReader {
  return new WrittenDate(order)
}

class WrittenDate implements StampReader {
  zoned = false
  private at = 0
  private digits = 0
  private dateMs = NaN
  private readonly cached = new Uint8Array(16)
  private cachedLength = 0
  private readonly order: DateOrder

  constructor(order: DateOrder) {
    this.order = order
  }

  read(bytes: Uint8Array, from: number, to: number): number {
    while (from < to && bytes[from] === 0x20) from++
    while (to > from && bytes[to - 1] === 0x20) to--
    this.zoned = false
    this.at = from
    if (!this.sameDate(bytes, from, to)) {
      this.cachedLength = 0
      this.dateMs = this.date(bytes, to)
      const length = this.at - from
      if (Number.isNaN(this.dateMs)) return NaN
      if (length <= this.cached.length) {
        this.cached.set(bytes.subarray(from, this.at))
        this.cachedLength = length
      }
    }
    if (this.at >= to) return this.dateMs
    const mark = bytes[this.at]!
    if (mark === 0x54 || mark === 0x74 || mark === 0x20 || mark === 0x5f) {
      while (this.at < to && (this.at === from || isGap(bytes[this.at]!))) this.at++
    } else return NaN
    return this.dateMs + this.clock(bytes, to)
  }

  /** Rows of a day share their date: most stamps are read from the clock alone. */
  private sameDate(bytes: Uint8Array, from: number, to: number): boolean {
    const length = this.cachedLength
    if (length === 0 || to - from < length) return false
    for (let i = 0; i < length; i++) if (bytes[from + i] !== this.cached[i]) return false
    // The cached date must end here too: 1.1.20 is no date of 1.1.2024.
    const next = from + length < to ? bytes[from + length]! : 0x20
    if (next >= 0x30 && next <= 0x39) return false
    this.at = from + length
    return true
  }

  private number(bytes: Uint8Array, to: number, most: number): number {
    let value = 0
    const from = this.at
    while (this.at < to && this.at - from < most) {
      const digit = bytes[this.at]! - 0x30
      if (!(digit >= 0 && digit <= 9)) break
      value = value * 10 + digit
      this.at++
    }
    this.digits = this.at - from
    return this.digits > 0 ? value : NaN
  }

  private twoDigits(bytes: Uint8Array, to: number): number {
    const value = this.number(bytes, to, 2)
    return this.digits === 2 ? value : NaN
  }

  private date(bytes: Uint8Array, to: number): number {
    const first = this.number(bytes, to, 8)
    const firstDigits = this.digits
    if (firstDigits === 8) {
      return civil(Math.floor(first / 10_000), Math.floor(first / 100) % 100, first % 100)
    }
    const separator = bytes[this.at]
    if (this.at >= to || !isDateSeparator(separator!)) return NaN
    this.at++
    const isNamed = bytes[this.at]! >= 0x41
    const second = isNamed ? this.monthName(bytes, to) : this.number(bytes, to, 2)
    if (this.at >= to || bytes[this.at] !== separator) return NaN
    this.at++
    const third = this.number(bytes, to, 4)
    const thirdDigits = this.digits
    if (firstDigits === 4) return thirdDigits <= 2 ? civil(first, second, third) : NaN
    if (firstDigits > 2 || this.order === 'ymd') {
      return isNamed && firstDigits <= 2 && thirdDigits === 4 ? civil(third, second, first) : NaN
    }
    if (thirdDigits !== 4 && thirdDigits !== 2) return NaN
    const year = thirdDigits === 2 ? 2000 + third : third
    return this.order === 'dmy' || isNamed ? civil(year, second, first) : civil(year, first, second)
  }

  private monthName(bytes: Uint8Array, to: number): number {
    let name = ''
    while (this.at < to && bytes[this.at]! >= 0x41) name += String.fromCharCode(bytes[this.at++]! | 0x20)
    const index = MONTHS.indexOf(name.slice(0, 3))
    return index < 0 ? NaN : index + 1
  }

  /** Clock, fraction, AM or PM, offset; NaN unless all of it is understood to the end. */
  private clock(bytes: Uint8Array, to: number): number {
    let hour = this.number(bytes, to, 2)
    let minute = 0
    let seconds = 0
    const hasColon = bytes[this.at] === COLON && this.at < to
    if (hasColon) this.at++
    if (hasColon || (this.at < to && isDigit(bytes[this.at]!))) {
      minute = this.twoDigits(bytes, to)
      const more = hasColon ? bytes[this.at] === COLON : isDigit(bytes[this.at] ?? 0)
      if (this.at < to && more) {
        if (hasColon) this.at++
        seconds = this.twoDigits(bytes, to)
        if (this.at < to && (bytes[this.at] === DOT || bytes[this.at] === COMMA)) {
          this.at++
          const fraction = this.number(bytes, to, 15)
          seconds += fraction / 10 ** this.digits
        }
      }
    }
    while (this.at < to && bytes[this.at] === 0x20) this.at++
    const letter = this.at < to ? bytes[this.at]! | 0x20 : 0
    if ((letter === 0x61 || letter === 0x70) && this.at + 2 <= to) {
      if ((bytes[this.at + 1]! | 0x20) !== 0x6d || !(hour >= 1 && hour <= 12)) return NaN
      hour = (hour % 12) + (letter === 0x70 ? 12 : 0)
      this.at += 2
    }
    if (!(minute <= 59 && seconds < 60 && (hour <= 23 || (hour === 24 && minute === 0 && seconds === 0)))) {
      return NaN
    }
    const offsetMs = this.at < to ? this.offset(bytes, to) : 0
    return hour * 3_600_000 + minute * 60_000 + Math.round(seconds * 1000) - offsetMs
  }

  private offset(bytes: Uint8Array, to: number): number {
    this.zoned = true
    const mark = bytes[this.at++]!
    if ((mark | 0x20) === 0x7a) return this.at === to ? 0 : NaN
    if (mark !== PLUS && mark !== MINUS) {
      const word = String.fromCharCode(...bytes.subarray(this.at - 1, to)).toUpperCase()
      return word === 'UTC' || word === 'GMT' ? 0 : NaN
    }
    const hours = this.number(bytes, to, 2)
    if (this.at < to && bytes[this.at] === COLON) this.at++
    const minutes = this.at < to ? this.number(bytes, to, 2) : 0
    if (this.at !== to || !(hours <= 18 && minutes <= 59)) return NaN
    return (mark === MINUS ? -1 : 1) * (hours * 60 + minutes) * 60_000
  }
}

/** Reader of numbers: `toMs` turns the number into epoch ms. */
export function numberReader(toMs: (value: number) => number, zoned: boolean): StampReader {
  return {
    zoned,
    read(bytes, from, to) {
      while (from < to && bytes[from] === 0x20) from++
      while (to > from && bytes[to - 1] === 0x20) to--
      if (from >= to || to - from > 32) return NaN
      const text = String.fromCharCode(...bytes.subarray(from, to)).replace(',', '.')
      if (!/^-?\d+(\.\d+)?([eE][+]?\d+)?$/.test(text)) return NaN
      return Math.round(toMs(Number(text)))
    },
  }
}

/** Clock alone, ms of the day; NaN = unreadable. */
export function clockMs(text: string): number {
  const reader = dateReader('ymd')
  const bytes = Buffer.from(`1970-01-01 ${text.trim()}`)
  const ms = reader.read(bytes, 0, bytes.length)
  return reader.zoned || !/^\s*\d{1,2}:\d{2}/.test(text) ? NaN : ms
}

/** Epoch ms of a day of the proleptic Gregorian calendar; NaN for a day that does not exist. */
function civil(year: number, month: number, day: number): number {
  if (!(year >= 1900 && year <= 2200 && month >= 1 && month <= 12 && day >= 1 && day <= 31)) return NaN
  const ms = Date.UTC(year, month - 1, day)
  // The 31st of a month of 30 days would become the 1st of the next one.
  return day > 28 && new Date(ms).getUTCDate() !== day ? NaN : Math.trunc(ms / DAY_MS) * DAY_MS
}

const isDigit = (byte: number) => byte >= 0x30 && byte <= 0x39
const isGap = (byte: number) => byte === 0x20 || byte === 0x54 || byte === 0x74 || byte === 0x5f
const isDateSeparator = (byte: number) => byte === MINUS || byte === SLASH || byte === DOT
