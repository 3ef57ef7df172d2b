import { setImmediate } from 'node:timers/promises'
import type { ScoreSheet } from '../../sheet/index.ts'
import type { Store } from '../../store/index.ts'

const PAGE = 100

/** Sheets of the newest finished replays of a site, newest made first. */
export async function sheetsOf(store: Store, site: string, most: number): Promise<ScoreSheet[]> {
  const sheets: ScoreSheet[] = []
  for await (const id of finished(store, site)) {
    const sheet = await sheetOf(store, id)
    if (sheet) sheets.push(sheet)
    if (sheets.length >= most) break
    await setImmediate() // a sheet is about a megabyte of text: others get their turn between two
  }
  return sheets
}

/** The sheet that was made before that of the given replay; null when that is the first of the site. */
export async function sheetBefore(store: Store, site: string, id: string): Promise<ScoreSheet | null> {
  let isBehind = false
  for await (const other of finished(store, site)) {
    if (isBehind) {
      const sheet = await sheetOf(store, other)
      if (sheet) return sheet
    }
    isBehind ||= other === id
  }
  return null
}

async function* finished(store: Store, site: string): AsyncGenerator<string> {
  let after: string | undefined
  do {
    const page = await store.replays.list({
      limit: PAGE,
      site,
      state: 'done',
      sheets: false,
      ...(after === undefined ? {} : { after }),
    })
    for (const { id } of page.replays) yield id
    after = page.next ?? undefined
  } while (after !== undefined)
}

/** Null when it was removed in the meantime. */
async function sheetOf(store: Store, id: string): Promise<ScoreSheet | null> {
  const record = await store.replays.get(id)
  return record?.sheet ? (JSON.parse(record.sheet) as ScoreSheet) : null
}
