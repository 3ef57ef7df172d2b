import { IANAZone } from 'luxon'
import { InputError } from '../errors.ts'
import { SiteFile, type SiteValue } from '../sheet/index.ts'
import { checkShape } from './check-shape.ts'

const PRICES = ['pricePerMwh', 'monthlyPricesPerMwh', 'hourlyPricesPerMwh'] as const

/**
 * A site file that came from outside: its schema, and what a schema cannot say.
 *
 * @param place  name that errors start with: `site`, or the file as the caller named it.
 * @throws InputError BAD_SITE
 */
export function checkSite(value: unknown, place: string): SiteFile {
  const site = checkShape(SiteFile, value, { code: 'BAD_SITE', place })
  if (site.timezone !== undefined && !IANAZone.isValidZone(site.timezone)) {
    throw new InputError(
      'BAD_SITE',
      `${place}.timezone: expected an IANA zone such as "Europe/Berlin", got "${site.timezone}"`,
    )
  }
  if (site.value !== undefined) checkPrice(site.value, `${place}.value`)
  const seen = new Set<string>()
  for (const [index, { turbine }] of (site.turbines ?? []).entries()) {
    if (seen.has(turbine)) {
      throw new InputError(
        'BAD_SITE',
        `${place}.turbines[${index}].turbine: expected every turbine once, got "${turbine}" again`,
      )
    }
    seen.add(turbine)
  }
  for (const [index, { from, to }] of (site.exclude ?? []).entries()) {
    if (!(Date.parse(from) < Date.parse(to))) {
      throw new InputError(
        'BAD_SITE',
        `${place}.exclude[${index}].to: expected a time after ${from}, got ${to}`,
      )
    }
  }
  return site
}

/** Which price holds must not be left to chance. */
function checkPrice(value: SiteValue, place: string): void {
  const given = PRICES.filter((name) => value[name] !== undefined)
  if (given.length !== 1) {
    throw new InputError(
      'BAD_SITE',
      `${place}: expected exactly one of ${PRICES.join(', ')}, got ${given.join(' and ') || 'none'}`,
    )
  }
}
