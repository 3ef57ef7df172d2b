import { InputError } from '../errors.ts'
import type { SiteFile } from '../sheet/index.ts'
import { checkSite } from './check-site.ts'

/**
 * A site file from its text.
 *
 * @param json   JSON, with or without a byte order mark.
 * @param place  name that errors start with: `site`, or the file as the caller named it.
 * @throws InputError BAD_SITE
 */
export function parseSite(json: string, place: string): SiteFile {
  let value: unknown
  try {
    value = JSON.parse(json.replace(/^\uFEFF/, ''))
  } catch (cause) {
    throw new InputError(
      'BAD_SITE',
      `${place}: expected JSON, got text that is none (${(cause as Error).message})`,
      { cause },
    )
  }
  return checkSite(value, place)
}
