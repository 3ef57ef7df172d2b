import { IANAZone } from 'luxon'
import { InputError } from '../errors.ts'
import { SiteFile } from '../sheet/index.ts'
import { checkShape } from './check-shape.ts'

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
