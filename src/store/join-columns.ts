import { quoteIdentifier, quoteText, writeParquet, type Scans } from '../duck/index.ts'
import { asStorageFull } from './space.ts'

/**
 * Writes rows together with further columns for each of them. Where the rows have such a column already, its values stay and
 * the others fill its gaps.
 *
 * @param path     Parquet of clean rows.
 * @param columnsPath  Parquet of `turbine`, `time` and the columns, row for row in the same order.
 * @param targetPath  where to.
 * @param scans    may read and write the folders of all three.
 * @throws InputError STORAGE_FULL
 */
export async function joinColumns(
  scans: Scans,
  { path, columnsPath, targetPath }: { path: string; columnsPath: string; targetPath: string },
  columns: readonly string[],
): Promise<void> {
  const rows = `read_parquet(${quoteText(path)})`
  const both = `${rows} AS kept POSITIONAL JOIN read_parquet(${quoteText(columnsPath)}) AS made`
  await scans.withConnection(async (connection) => {
    const [odd] = await connection.records(
      `SELECT count(*) FILTER (kept.turbine IS DISTINCT FROM made.turbine OR kept.time IS DISTINCT FROM made.time) AS apart
       FROM ${both}`,
    )
    if (odd?.['apart'] !== 0) throw new Error('rows and their further columns are not in the same order')
    const described = await connection.records(`DESCRIBE SELECT * FROM ${rows}`)
    const known = new Set(described.map((column) => String(column['column_name'])))
    const filled = columns
      .filter((name) => known.has(name))
      .map((name) => {
        const column = quoteIdentifier(name)
        return `coalesce(kept.${column}, made.${column}) AS ${column}`
      })
    const added = columns
      .filter((name) => !known.has(name))
      .map((name) => `made.${quoteIdentifier(name)} AS ${quoteIdentifier(name)}`)
    const list = [`kept.*${filled.length > 0 ? ` REPLACE (${filled.join(', ')})` : ''}`, ...added]
    try {
      await writeParquet(connection, `SELECT ${list.join(', ')} FROM ${both}`, targetPath)
    } catch (error) {
      throw asStorageFull(error)
    }
  })
}
