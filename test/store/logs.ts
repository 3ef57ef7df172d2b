import { join } from 'node:path'
import { readColumns, quoteText, writeParquet } from '../../src/duck/index.ts'
import type { Receipt } from '../../src/sheet/index.ts'
import type { LogWindow, Store } from '../../src/store/index.ts'

/** Turbine, time in ms, power. */
export type LogRow = readonly [turbine: string, time: number, power: number | null]

let staged = 0

/** Writes rows the way a staged log is: sorted, each pair once. */
export async function stageRows(store: Store, rows: readonly LogRow[], extra = ''): Promise<string> {
  const path = join(store.tempFolder, `log-${++staged}.parquet`)
  const values = rows.map(([turbine, time, power]) => `(${quoteText(turbine)}, ${time}, ${power ?? 'NULL'})`)
  await store.scans.withConnection((connection) =>
    writeParquet(
      connection,
      `SELECT turbine::VARCHAR AS turbine, time::BIGINT AS time, power::DOUBLE AS power ${extra}
       FROM (VALUES ${values.join(', ')}) v(turbine, time, power) ORDER BY turbine, time`,
      path,
    ),
  )
  return path
}

export async function addRows(
  store: Store,
  site: string,
  rows: readonly LogRow[],
  options: { contentKey?: string; extra?: string; rejectedPath?: string } = {},
) {
  return store.logs.add({
    site,
    path: await stageRows(store, rows, options.extra),
    rejectedPath: options.rejectedPath ?? null,
    receipt: receiptOf(rows.length),
    reading: { timezone: 'UTC' },
    contentKey: options.contentKey ?? `content-${++staged}`,
  })
}

export async function readRows(store: Store, site: string, window: LogWindow = {}): Promise<LogRow[]> {
  const { path, rows } = await store.logs.readWindow(site, window)
  if (path === null) return []
  const { columns, rows: read } = await store.scans.withConnection((connection) =>
    readColumns(connection, `read_parquet(${quoteText(path)})`, {
      turbine: 'text',
      time: 'number',
      power: 'number',
    }),
  )
  if (read !== rows) throw new Error(`window: said ${rows} rows, the file holds ${read}`)
  return Array.from(columns.time, (time, i) => {
    const power = columns.power[i]!
    return [columns.turbine[i]!, time, Number.isNaN(power) ? null : power] as const
  })
}

export function receiptOf(rows: number): Receipt {
  return {
    received: rows,
    accepted: rows,
    duplicate: 0,
    rejected: 0,
    rejectedByReason: [],
    blankLines: 0,
    first: null,
    last: null,
    intervalS: 600,
    turbines: [],
    columns: [],
    inputs: [],
    warnings: [],
  }
}
