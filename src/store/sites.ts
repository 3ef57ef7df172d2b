import { InputError } from '../errors.ts'
import type { SiteFile } from '../sheet/index.ts'
import type { CatalogueDriver, Transaction } from './catalogue/driver.ts'

export interface SiteStore {
  /** Keeps the site file, whole, in place of an older one. True when the site is new. The caller has validated it. */
  put(site: string, file: SiteFile): Promise<boolean>
  get(site: string): Promise<SiteFile | undefined>
  /**
   * Changes the file from what it is at that moment, so that no change made in between is lost.
   * @throws InputError SITE_NOT_FOUND; and whatever `change` throws, then nothing is changed
   */
  change(site: string, change: (file: SiteFile) => SiteFile): Promise<SiteFile>
  /**
   * By name, in byte order. `next` is the name to pass as `after`, null on the last page.
   * @param page.limit  1 to 1000
   */
  list(page: { after?: string; limit: number }): Promise<{ sites: string[]; next: string | null }>
}

export function siteStore(driver: CatalogueDriver, clock: () => number): SiteStore {
  return {
    put: (site, file) =>
      driver.write(async (transaction) => {
        const known = await readSite(transaction, site)
        await transaction.query(
          `INSERT INTO sites (site, document, created_ms, changed_ms) VALUES ($1, $2, $3, $3)
           ON CONFLICT (site) DO UPDATE SET document = excluded.document, changed_ms = excluded.changed_ms`,
          [site, JSON.stringify({ ...file, site }), clock()],
        )
        return known === undefined
      }),
    get: (site) => readSite(driver, site),
    change: (site, change) =>
      driver.write(async (transaction) => {
        const file = await requireSite(transaction, site)
        const changed = { ...change(file), site }
        await writeSite(transaction, site, changed, clock())
        return changed
      }),
    async list({ after, limit }) {
      if (!(Number.isInteger(limit) && limit >= 1 && limit <= 1000)) {
        throw new InputError('BAD_REQUEST', `limit: expected a whole number from 1 to 1000, got ${limit}`)
      }
      const rows = await driver.query(
        `SELECT site FROM sites ${after === undefined ? '' : 'WHERE site > $2'}
         ORDER BY site NULLS LAST LIMIT $1`,
        after === undefined ? [limit + 1] : [limit + 1, after],
      )
      const sites = rows.slice(0, limit).map((row) => row['site'] as string)
      return { sites, next: rows.length > limit ? sites.at(-1)! : null }
    },
  }
}

export async function readSite(
  source: Pick<Transaction, 'query'>,
  site: string,
): Promise<SiteFile | undefined> {
  const rows = await source.query('SELECT document FROM sites WHERE site = $1', [site])
  return rows[0] && (JSON.parse(rows[0]['document'] as string) as SiteFile)
}

/** @throws InputError SITE_NOT_FOUND */
export async function requireSite(source: Pick<Transaction, 'query'>, site: string): Promise<SiteFile> {
  const file = await readSite(source, site)
  if (!file)
    throw new InputError('SITE_NOT_FOUND', `site: expected one that was put, got "${site.slice(0, 100)}"`)
  return file
}

export async function writeSite(
  transaction: Transaction,
  site: string,
  file: SiteFile,
  nowMs: number,
): Promise<void> {
  await transaction.query('UPDATE sites SET document = $2, changed_ms = $3 WHERE site = $1', [
    site,
    JSON.stringify(file),
    nowMs,
  ])
}
