import { InputError } from '../errors.ts'
import type { Replays } from '../replay/contract.ts'
import type { Setup } from '../setup/index.ts'
import type { ScoreSheet, TurbineSheet } from '../sheet/index.ts'

const PAGE = 50
/** A dashboard asks five questions about each turbine of a site, and all are answered from one sheet of about a megabyte. */
const SHEETS_AT_HAND = 4

/** Finds the newest answers of a site. */
export interface LatestSheets {
  /** The newest finished replay of the site. @throws InputError SITE_NOT_FOUND, REPLAY_NOT_FOUND */
  ofSite(site: string): Promise<ScoreSheet>
  /** The newest one that holds the turbine. @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND, REPLAY_NOT_FOUND */
  ofTurbine(site: string, turbine: string): Promise<{ sheet: ScoreSheet; turbine: TurbineSheet }>
}

export function latestSheets(replays: Replays, setup: Setup): LatestSheets {
  const atHand = new Map<string, ScoreSheet>()

  const read = async (id: string): Promise<ScoreSheet | undefined> => {
    const known = atHand.get(id)
    if (known !== undefined) return known
    const { sheet } = await replays.get(id)
    if (sheet === null) return undefined
    const parsed = JSON.parse(sheet) as ScoreSheet
    const oldest = atHand.keys().next().value
    if (atHand.size >= SHEETS_AT_HAND && oldest !== undefined) atHand.delete(oldest)
    atHand.set(id, parsed)
    return parsed
  }

  const find = async <T>(
    site: string,
    pick: (sheet: ScoreSheet) => T | undefined,
  ): Promise<T | undefined> => {
    let after: string | undefined
    do {
      const page = await replays.list({
        limit: PAGE,
        site,
        state: 'done',
        ...(after === undefined ? {} : { after }),
      })
      for (const { id } of page.replays) {
        const sheet = await read(id)
        const picked = sheet === undefined ? undefined : pick(sheet)
        if (picked !== undefined) return picked
      }
      after = page.next ?? undefined
    } while (after !== undefined)
    return undefined
  }

  return {
    async ofSite(site) {
      const sheet = await find(site, (one) => one)
      if (sheet !== undefined) return sheet
      await setup.getSite(site)
      throw nothingYet(`site "${site}"`)
    },
    async ofTurbine(site, name) {
      const found = await find(site, (sheet) => {
        const turbine = sheet.turbines.find((one) => one.turbine === name)
        return turbine && { sheet, turbine }
      })
      if (found !== undefined) return found
      await setup.getTurbine(site, name)
      throw nothingYet(`turbine "${name}" of site "${site}"`)
    },
  }
}

function nothingYet(what: string): InputError {
  return new InputError(
    'REPLAY_NOT_FOUND',
    `${what}: expected a finished replay, got none; start one with POST /v1/replays {"site", "from", "to"}`,
  )
}
