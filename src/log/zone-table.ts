import { IANAZone } from 'luxon'
import { InputError } from '../errors.ts'

const DAY_MS = 86_400_000

/** A stretch of time with one offset. */
interface Stretch {
  /** First instant, epoch ms. */
  readonly from: number
  /** First instant after it. */
  readonly to: number
  readonly offsetMs: number
}

/** The instants that show a wall-clock time: none in the spring gap, two in the repeated hour. */
export interface ZoneTable {
  readonly name: string
  /** The earlier instant, NaN in a gap. */
  first(wallMs: number): number
  /** The later instant, NaN when there is only one or none. */
  second(wallMs: number): number
}

/**
 * Table of a zone's offsets, built year by year as stamps ask for them. The offset of an instant comes from luxon; gap and
 * repeated hour are decided here, because the libraries resolve both silently.
 *
 * @param name  IANA name.
 * @throws InputError BAD_OPTION for a name that is none
 */
export function zoneTable(name: string): ZoneTable {
  if (/^(utc|etc\/utc|z|gmt|etc\/gmt)$/i.test(name)) {
    return { name: 'UTC', first: (wallMs) => wallMs, second: () => NaN }
  }
  if (!IANAZone.isValidZone(name)) {
    throw new InputError(
      'BAD_OPTION',
      `timezone: expected an IANA name such as Europe/Berlin, got ${JSON.stringify(name)}`,
    )
  }
  const zone = IANAZone.create(name)
  const years = new Map<number, Stretch[]>()
  // The stretch of the last stamp, narrowed to wall-clock times that no other stretch shows.
  let plain = { from: NaN, to: NaN, offsetMs: 0 }

  const stretchesAt = (wallMs: number): Stretch[] => {
    const year = new Date(wallMs).getUTCFullYear()
    let list = years.get(year)
    if (!list) years.set(year, (list = stretches(zone, Date.UTC(year, 0, 1), Date.UTC(year + 1, 0, 1))))
    return list
  }
  const instants = (wallMs: number): number[] =>
    stretchesAt(wallMs)
      .filter((s) => wallMs - s.offsetMs >= s.from && wallMs - s.offsetMs < s.to)
      .map((s) => wallMs - s.offsetMs)
  const remember = (wallMs: number, instant: number) => {
    const offsetMs = wallMs - instant
    const list = stretchesAt(wallMs)
    const index = list.findIndex((s) => instant >= s.from && instant < s.to)
    const before = list[index - 1]
    const here = list[index]!
    const after = list[index + 1]
    plain = {
      from: Math.max(here.from + offsetMs, before ? before.to + before.offsetMs : -Infinity),
      to: Math.min(here.to + offsetMs, after ? after.from + after.offsetMs : Infinity),
      offsetMs,
    }
  }
  return {
    name,
    first(wallMs) {
      if (wallMs >= plain.from && wallMs < plain.to) return wallMs - plain.offsetMs
      if (!(Math.abs(wallMs) < 8e15)) return NaN
      const found = instants(wallMs)
      if (found.length === 1) remember(wallMs, found[0]!)
      return found.length === 0 ? NaN : Math.min(...found)
    },
    second(wallMs) {
      if (wallMs >= plain.from && wallMs < plain.to) return NaN
      const found = instants(wallMs)
      return found.length < 2 ? NaN : Math.max(...found)
    },
  }
}

/** Stretches that cover [from - 2 days, to + 2 days): a wall clock of the year may belong to an instant outside it. */
function stretches(zone: IANAZone, from: number, to: number): Stretch[] {
  const list: Stretch[] = []
  const end = to + 2 * DAY_MS
  let start = from - 2 * DAY_MS
  let offset = zone.offset(start)
  for (let day = start; day < end; day += DAY_MS) {
    // Two changes within a day have not occurred in any zone since 1970; a change and its reversal would be missed.
    if (zone.offset(day + DAY_MS) === offset) continue
    let low = day
    let high = day + DAY_MS
    while (high - low > 1000) {
      const middle = Math.floor((low + high) / 2000) * 1000
      if (zone.offset(middle) === offset) low = middle
      else high = middle
    }
    list.push({ from: start, to: high, offsetMs: offset * 60_000 })
    start = high
    offset = zone.offset(high)
  }
  list.push({ from: start, to: end, offsetMs: offset * 60_000 })
  return list
}
