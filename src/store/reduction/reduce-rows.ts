import { quoteText, readColumns, type Connection, type Scans } from '../../duck/index.ts'
import { countRows, type TurbineCount, type TurbineRows } from '../read-rows.ts'
import { REDUCED_INTERVAL_S } from './high-rate.ts'
import { highRateChannels, intervalSumsSql, sumNames, type HighRateChannel } from './interval-sums.ts'
import { intervalValues } from './interval-values.ts'
import { longestTexts } from './longest-text.ts'
import { expectedRows } from './native-interval.ts'

/** Time that one query reduces, ms: the sums of a longer one would outgrow the memory of scans. */
const CHUNK_MS = 32 * 86_400_000
const BIN_MS = REDUCED_INTERVAL_S * 1000

/**
 * Reduces a Parquet file of clean high-rate rows (turbine, time, channels) to statistics of 10-minute intervals, aligned to
 * UTC; one entry per turbine in byte order of their names. Memory grows with the intervals, not with the rows; the result
 * depends neither on the order of rows nor on the number of threads.
 *
 * Beside the channels (see {@link intervalValues}) there is `coverage`: rows that are there over rows that should be, 0 to 1.
 * A text is the one that held longest. Intervals without any row are not in the result.
 *
 * @param scans  may read the file's folder.
 * @param intervalS  of the rows, for turbines whose rows do not show it, s.
 */
export async function reduceRows(scans: Scans, path: string, intervalS: number): Promise<TurbineRows[]> {
  const source = `read_parquet(${quoteText(path)})`
  return scans.withConnection(async (connection) => {
    const described = await connection.records(`DESCRIBE SELECT * EXCLUDE (turbine, time) FROM ${source}`)
    const isText = (column: (typeof described)[number]) => column['column_type'] === 'VARCHAR'
    const nameOf = (column: (typeof described)[number]) => String(column['column_name'])
    const channels = highRateChannels(described.filter((column) => !isText(column)).map(nameOf))
    const texts = described.filter(isText).map(nameOf)
    const reduced: TurbineRows[] = []
    for (const extent of await countRows(scans, path)) {
      reduced.push(await reduceTurbine(connection, source, extent, { channels, texts, intervalS }))
    }
    return reduced
  })
}

async function reduceTurbine(
  connection: Connection,
  source: string,
  { turbine, firstMs, lastMs }: TurbineCount,
  about: { channels: readonly HighRateChannel[]; texts: readonly string[]; intervalS: number },
): Promise<TurbineRows> {
  const own = `turbine = ${quoteText(turbine)}`
  const names = ['bin', 'row_count', ...sumNames(about.channels)]
  const kinds = Object.fromEntries(names.map((name) => [name, 'number' as const]))
  const parts: Record<string, Float64Array>[] = []
  for (let fromMs = Math.floor(firstMs / BIN_MS) * BIN_MS; fromMs <= lastMs; fromMs += CHUNK_MS) {
    const where = `${own} AND time >= ${fromMs} AND time < ${fromMs + CHUNK_MS}`
    const sums = intervalSumsSql(source, where, about.channels)
    parts.push((await readColumns(connection, sums, kinds, { orderBy: 'bin' })).columns)
  }
  const joined = Object.fromEntries(names.map((name) => [name, join(parts.map((part) => part[name]!))]))
  const time = joined['bin']!
  const rows = joined['row_count']!
  const numbers = intervalValues(about.channels, joined, rows)
  const expected = await expectedRows(connection, source, own, {
    spanMs: lastMs - firstMs,
    fallbackS: about.intervalS,
  })
  numbers['coverage'] = rows.map((count, i) => Math.min(1, count / expected(time[i]!)))
  const texts: Record<string, (string | null)[]> = {}
  for (const column of about.texts) {
    const longest = await longestTexts(connection, source, own, column)
    texts[column] = Array.from(time, (bin) => longest.get(bin) ?? null)
  }
  return { turbine, time, numbers, texts }
}

function join(parts: readonly Float64Array[]): Float64Array {
  const joined = new Float64Array(parts.reduce((sum, part) => sum + part.length, 0))
  let at = 0
  for (const part of parts) {
    joined.set(part, at)
    at += part.length
  }
  return joined
}
