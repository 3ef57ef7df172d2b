import { DateTime } from 'luxon'
import type { SiteValue } from '../../sheet/index.ts'

/** Offsets of zones are whole quarters of an hour, so that a price holds for one at least. */
const SLOT_MS = 900_000
/** Mean lengths of the months, days. */
const MONTH_DAYS = [31, 28.2425, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31] as const

/** Prices of a window as plain data, so that they can travel to a worker thread. */
export interface Prices {
  readonly currency: string
  /** The same for every turbine of the farm. NaN = not the same at all times: `slots` has it. */
  readonly flatPerMwh: number
  /** Price of each quarter of an hour from `fromMs` on; null where one price holds. */
  readonly slots: { readonly fromMs: number; readonly perMwh: Float64Array } | null
  /** Price that a year is valued at; NaN = the mean of the window's own recoverable energy. */
  readonly annualPerMwh: number
  readonly note: string
}

/**
 * The prices of a site over a window.
 *
 * @param value  checked: exactly one kind of price. Absent: no price.
 * @param timezone  IANA name: months and hours are those of the site's clock.
 * @returns null without a price.
 */
export function pricesOver(
  value: SiteValue | undefined,
  window: { timezone: string; fromMs: number; toMs: number },
): Prices | null {
  if (value === undefined) return null
  const { currency, pricePerMwh, monthlyPricesPerMwh: monthly, hourlyPricesPerMwh: hourly } = value
  if (pricePerMwh !== undefined) {
    const note = 'one price at all times'
    return { currency, flatPerMwh: pricePerMwh, slots: null, annualPerMwh: pricePerMwh, note }
  }
  if (monthly !== undefined) {
    return {
      currency,
      flatPerMwh: NaN,
      slots: slotsOf(window, (local) => monthly[local.month - 1]!),
      annualPerMwh:
        monthly.reduce((sum, price, month) => sum + price * MONTH_DAYS[month]!, 0) /
        MONTH_DAYS.reduce((sum, days) => sum + days, 0),
      note: 'prices by month: the window at those of its months, a year at the mean of the twelve weighted by days',
    }
  }
  if (hourly === undefined) return null
  return {
    currency,
    flatPerMwh: NaN,
    slots: slotsOf(window, (local) => hourly[local.hour]!),
    annualPerMwh: NaN,
    note: 'prices by hour of the day: the window at those of its hours, a year at the mean price of the energy recoverable in the window',
  }
}

/** Price at a moment, per MWh; beyond the window the nearest one. */
export function priceAt(prices: Prices, timeMs: number): number {
  const { slots } = prices
  if (slots === null) return prices.flatPerMwh
  const slot = Math.floor((timeMs - slots.fromMs) / SLOT_MS)
  return slots.perMwh[Math.min(Math.max(slot, 0), slots.perMwh.length - 1)]!
}

function slotsOf(
  { timezone, fromMs, toMs }: { timezone: string; fromMs: number; toMs: number },
  priceOf: (local: DateTime) => number,
): NonNullable<Prices['slots']> {
  const first = Math.floor(fromMs / SLOT_MS)
  const count = Math.max(1, Math.ceil(toMs / SLOT_MS) - first)
  const perMwh = new Float64Array(count)
  for (let slot = 0; slot < count; slot++) {
    perMwh[slot] = priceOf(DateTime.fromMillis((first + slot) * SLOT_MS, { zone: timezone }))
  }
  return { fromMs: first * SLOT_MS, perMwh }
}
