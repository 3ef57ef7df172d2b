import type { ColumnMap } from './column-map.ts'
import { dateReader, type StampReader } from './stamp-reader.ts'

/** Reads the time of a row, wherever in its fields it stands. */
export interface RowTime {
  /**
   * @param ends  end of each field in `bytes`; a field starts one byte after the end of the one before.
   * @returns epoch ms, or a wall clock as if it were UTC when `zoned` is false; NaN = unreadable.
   */
  read(bytes: Buffer, lineStart: number, ends: Int32Array): number
  readonly zoned: boolean
  /** Whether the row states no time at all. */
  isBlank(bytes: Buffer, lineStart: number, ends: Int32Array): boolean
}

/** Time from one field. */
export function stampTime(field: number, reader: StampReader): RowTime {
  return {
    get zoned() {
      return reader.zoned
    },
    read(bytes, lineStart, ends) {
      return reader.read(bytes, field === 0 ? lineStart : ends[field - 1]! + 1, ends[field]!)
    },
    isBlank: (bytes, lineStart, ends) => fieldText(bytes, lineStart, ends, field) === '',
  }
}

/** Time from a date and a clock in two fields. */
export function dateClockTime(time: { day: number; clock: number }, reader: StampReader): RowTime {
  return pairTime(time, reader, (day) => day)
}

/**
 * Time from a day number and a clock in two fields.
 * @param lowestDay  the day number that falls on `startMs`
 */
export function dayClockTime(
  time: { day: number; clock: number },
  lowestDay: number,
  startMs: number,
): RowTime {
  return pairTime(time, dateReader('ymd'), (day) => {
    const ms = /^-?\d+(\.0*)?$/.test(day) ? startMs + (Number(day) - lowestDay) * 86_400_000 : NaN
    return Math.abs(ms) < 4e12 ? new Date(ms).toISOString().slice(0, 10) : 'x'
  })
}

function pairTime(
  time: { day: number; clock: number },
  reader: StampReader,
  toDate: (day: string) => string,
): RowTime {
  return {
    get zoned() {
      return reader.zoned
    },
    read(bytes, lineStart, ends) {
      const date = toDate(fieldText(bytes, lineStart, ends, time.day))
      const clock = fieldText(bytes, lineStart, ends, time.clock)
      if (date === '' || !/^\d{1,2}:\d{2}/.test(clock)) return NaN
      const text = Buffer.from(`${date} ${clock}`)
      return reader.read(text, 0, text.length)
    },
    isBlank: (bytes, lineStart, ends) =>
      fieldText(bytes, lineStart, ends, time.day) === '' ||
      fieldText(bytes, lineStart, ends, time.clock) === '',
  }
}

/** Text of a field, without blanks around it. `ends` holds the end of each field of the line. */
export function fieldText(bytes: Buffer, lineStart: number, ends: Int32Array, field: number): string {
  return bytes.toString('utf8', field === 0 ? lineStart : ends[field - 1]! + 1, ends[field]).trim()
}

export type PairColumns = Exclude<ColumnMap['time'], { kind: 'stamp' }>
