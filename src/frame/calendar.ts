import { DateTime, IANAZone } from 'luxon'
import { InputError } from '../errors.ts'

const HOUR_MS = 3_600_000
const DAY_MS = 24 * HOUR_MS

/** Calendar days of a site over a window, and the hour on its clock. */
export interface Calendar {
  readonly timezone: string
  readonly days: number
  /** Index of the site's calendar day, 0 = the day of the first moment. */
  dayOf(timeMs: number): number
  /** Hour on the site's clock, 0 to 23. */
  hourOf(timeMs: number): number
}

/**
 * Days and hours of a zone between two moments. The zone's offset is looked up once an hour of the window where it
 * changes and once a day elsewhere; rows then cost an addition.
 *
 * @param timezone  IANA name.
 * @param fromMs    epoch ms, first moment; `toMs` the first moment after the window.
 * @throws InputError BAD_OPTION for an unknown zone
 */
export function buildCalendar(timezone: string, fromMs: number, toMs: number): Calendar {
  if (!IANAZone.isValidZone(timezone)) {
    throw new InputError(
      'BAD_OPTION',
      `timezone: expected an IANA name such as Europe/Berlin, got "${timezone}"`,
    )
  }
  const firstHour = Math.floor(fromMs / HOUR_MS)
  const hours = Math.max(1, Math.ceil(toMs / HOUR_MS) - firstHour + 1)
  const offsetMs = new Float64Array(hours)
  for (let start = 0; start < hours; start += 24) {
    const end = Math.min(start + 24, hours)
    const atStart = offsetAt(timezone, (firstHour + start) * HOUR_MS)
    const atEnd = offsetAt(timezone, (firstHour + end) * HOUR_MS)
    for (let h = start; h < end; h++) {
      offsetMs[h] = atStart === atEnd ? atStart : offsetAt(timezone, (firstHour + h) * HOUR_MS)
    }
  }
  const localMs = (timeMs: number): number => {
    const hour = Math.min(Math.max(Math.floor(timeMs / HOUR_MS) - firstHour, 0), hours - 1)
    return timeMs + offsetMs[hour]!
  }
  const firstDay = Math.floor(localMs(fromMs) / DAY_MS)
  return {
    timezone,
    days: Math.floor(localMs(Math.max(fromMs, toMs - 1)) / DAY_MS) - firstDay + 1,
    dayOf: (timeMs) => Math.floor(localMs(timeMs) / DAY_MS) - firstDay,
    hourOf: (timeMs) => Math.floor((localMs(timeMs) % DAY_MS) / HOUR_MS),
  }
}

function offsetAt(timezone: string, timeMs: number): number {
  return DateTime.fromMillis(timeMs, { zone: timezone }).offset * 60_000
}
