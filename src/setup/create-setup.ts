import { InputError } from '../errors.ts'
import { TurbineSetup, type SiteFile } from '../sheet/index.ts'
import type { Store } from '../store/index.ts'
import { checkShape } from './check-shape.ts'
import { checkSite } from './check-site.ts'
import {
  checkEntry,
  entriesOf,
  withEntry,
  withoutEntry,
  type EntryList,
  type SiteEntry,
} from './site-entries.ts'

/** What is known about sites and their turbines. */
export interface Setup {
  /**
   * Keeps a site file in place of an older one; logs that are stored stay.
   * @param value  as it came in; its `site`, where given, must be the same name
   * @throws InputError BAD_SITE, STORAGE_FULL
   */
  putSite(site: string, value: unknown): Promise<{ file: SiteFile; isNew: boolean }>
  /** @throws InputError SITE_NOT_FOUND */
  getSite(site: string): Promise<SiteFile>
  /** By name. `next` is the `after` of the next page, null on the last. @throws InputError BAD_REQUEST */
  listSites(page: { after?: string; limit: number }): Promise<{ sites: string[]; next: string | null }>
  /** With all its logs. @throws InputError SITE_NOT_FOUND */
  removeSite(site: string): Promise<void>
  /** @throws InputError BAD_SITE, SITE_NOT_FOUND */
  putTurbine(site: string, turbine: string, value: unknown): Promise<{ setup: TurbineSetup; isNew: boolean }>
  /** @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND */
  getTurbine(site: string, turbine: string): Promise<TurbineSetup>
  /** Its set-up; rows of its logs stay. @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND */
  removeTurbine(site: string, turbine: string): Promise<void>
  /** What a list of the site file holds, by time. @throws InputError SITE_NOT_FOUND */
  listEntries<L extends EntryList>(site: string, list: L): Promise<SiteEntry<L>[]>
  /**
   * Adds an entry to a list of the site file; one that is there already is not added again.
   * @throws InputError SITE_NOT_FOUND, BAD_SITE
   */
  addEntry<L extends EntryList>(
    site: string,
    list: L,
    value: unknown,
  ): Promise<{ entry: SiteEntry<L>; isNew: boolean }>
  /** @throws InputError SITE_NOT_FOUND, ENTRY_NOT_FOUND */
  removeEntry(site: string, list: EntryList, id: string): Promise<void>
}

export function createSetup(store: Store): Setup {
  const getSite = async (site: string) => {
    const file = await store.sites.get(site)
    if (!file) {
      throw new InputError('SITE_NOT_FOUND', `site: expected one that was put, got "${site.slice(0, 100)}"`)
    }
    return file
  }
  return {
    async putSite(site, value) {
      const given = checkSite(value, 'site')
      if (given.site !== undefined && given.site !== site) {
        throw new InputError(
          'BAD_SITE',
          `site.site: expected "${site}" as in the address, got "${given.site}"`,
        )
      }
      const file = checkSite({ ...given, site }, 'site')
      const isNew = await store.sites.put(site, file)
      return { file, isNew }
    },
    getSite,
    listSites: (page) => store.sites.list(page),
    async removeSite(site) {
      if (!(await store.logs.removeSite(site))) await getSite(site)
    },
    async putTurbine(site, turbine, value) {
      const given = isRecord(value) && value['turbine'] === undefined ? { ...value, turbine } : value
      const setup = checkShape(TurbineSetup, given, { code: 'BAD_SITE', place: 'turbine' })
      if (setup.turbine !== turbine) {
        throw new InputError(
          'BAD_SITE',
          `turbine.turbine: expected "${turbine}" as in the address, got "${setup.turbine}"`,
        )
      }
      let isNew = false
      await store.sites.change(site, (file) => {
        const turbines = [...(file.turbines ?? [])]
        const index = turbines.findIndex((one) => one.turbine === turbine)
        isNew = index < 0
        if (isNew) turbines.push(setup)
        else turbines[index] = setup
        return checkSite({ ...file, turbines }, 'site')
      })
      return { setup, isNew }
    },
    async getTurbine(site, turbine) {
      const file = await getSite(site)
      return (file.turbines ?? []).find((one) => one.turbine === turbine) ?? missing(site, turbine)
    },
    async removeTurbine(site, turbine) {
      await store.sites.change(site, (file) => {
        const turbines = (file.turbines ?? []).filter((one) => one.turbine !== turbine)
        if (turbines.length === (file.turbines ?? []).length) missing(site, turbine)
        return { ...file, turbines }
      })
    },
    listEntries: async (site, list) => entriesOf(await getSite(site), list),
    async addEntry(site, list, value) {
      const entry = checkEntry(list, value)
      let isNew = false
      await store.sites.change(site, (file) => {
        isNew = !entriesOf(file, list).some(({ id }) => id === entry.id)
        return isNew ? checkSite(withEntry(file, list, entry), 'site') : file
      })
      return { entry, isNew }
    },
    async removeEntry(site, list, id) {
      await store.sites.change(site, (file) => withoutEntry(file, list, id))
    },
  }
}

function isRecord(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null && !Array.isArray(value)
}

function missing(site: string, turbine: string): never {
  throw new InputError(
    'TURBINE_NOT_FOUND',
    `turbine: expected one of site "${site}", got "${turbine.slice(0, 100)}"`,
  )
}
