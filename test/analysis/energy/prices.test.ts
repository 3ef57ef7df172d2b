import { expect, test } from 'vitest'
import { energyLoss, pricesOver } from '../../../src/analysis/index.ts'
import type { SiteValue } from '../../../src/sheet/index.ts'
import { frameOf, syntheticColumns } from '../synthetic.ts'

const frame = frameOf(syntheticColumns({ days: 20 })).frame
const WINDOW = { timezone: 'UTC', fromMs: frame.time[0]!, toMs: frame.time.at(-1)! + 600_000 }
const lossAt = (value: SiteValue | undefined, standingDeg = 6, timezone = 'UTC') =>
  energyLoss(frame, {
    exponent: 3,
    offset: {
      offsetDeg: standingDeg,
      standingDeg,
      standingInterval95Deg: [standingDeg - 2, standingDeg + 2],
    },
    byExponent: [],
    prices: pricesOver(value, { ...WINDOW, timezone }),
  })

test('without a price there is no money', () => {
  expect(lossAt(undefined).value).toBeNull()
})

test('one price multiplies window, year and interval', () => {
  const { static: loss, value } = lossAt({ currency: 'EUR', pricePerMwh: 60 })
  expect(value).toMatchObject({ currency: 'EUR', windowPricePerMwh: 60, annualPricePerMwh: 60 })
  expect(value!.window).toBeCloseTo(60 * loss.windowMwh!, 9)
  expect(value!.annual).toBeCloseTo(60 * loss.annualMwh!, 9)
  expect(value!.annualInterval95[0]).toBeCloseTo(60 * loss.annualInterval95Mwh[0]!, 9)
  expect(value!.annualInterval95[1]).toBeCloseTo(60 * loss.annualInterval95Mwh[1]!, 9)
})

test('prices by month: January for a window in January, the mean by days for a year', () => {
  const monthlyPricesPerMwh = [100, ...Array.from({ length: 11 }, () => 40)]
  const { value } = lossAt({ currency: 'EUR', monthlyPricesPerMwh })
  expect(value!.windowPricePerMwh).toBeCloseTo(100, 9)
  expect(value!.annualPricePerMwh).toBeCloseTo((31 * 100 + 334.2425 * 40) / 365.2425, 9)
})

test('prices by hour are those of the clock of the site, weighted by the energy recoverable then', () => {
  const hourly = (hours: readonly number[]) =>
    Array.from({ length: 24 }, (_, hour) => (hours.includes(hour) ? 100 : 0))
  const noon = { currency: 'EUR', hourlyPricesPerMwh: hourly([12]) }
  const shifted = { currency: 'EUR', hourlyPricesPerMwh: hourly([17]) }
  const utc = lossAt(noon).value!
  // 12:00 UTC is 17:00 to 18:00 in a zone five hours ahead.
  expect(lossAt(shifted, 6, 'Asia/Karachi').value!.windowPricePerMwh).toBeCloseTo(utc.windowPricePerMwh!, 9)
  expect(utc.windowPricePerMwh).toBeGreaterThan(100 / 24 / 2)
  expect(utc.windowPricePerMwh).toBeLessThan((2 * 100) / 24)
  // A flat table is a flat price.
  const flat = lossAt({ currency: 'EUR', hourlyPricesPerMwh: Array.from({ length: 24 }, () => 55) }).value!
  expect(flat.windowPricePerMwh).toBeCloseTo(55, 9)
  expect(flat.annualPricePerMwh).toBeCloseTo(55, 9)
})

test('where nothing stands off, nothing is won, and the interval still has its end', () => {
  const { value } = lossAt({ currency: 'EUR', hourlyPricesPerMwh: Array.from({ length: 24 }, () => 55) }, 0)
  expect(value!.window).toBe(0)
  expect(value!.annualInterval95[0]).toBe(0)
  expect(value!.annualInterval95[1]).toBeGreaterThan(0)
})

test('a price below zero turns the interval around', () => {
  const { value } = lossAt({ currency: 'EUR', pricePerMwh: -20 })
  const [low, high] = value!.annualInterval95 as [number, number]
  expect(low).toBeLessThan(high)
  expect(high).toBeLessThan(0)
})
