import { writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { openScans, quoteText, writeParquet, type Scans } from '../../src/duck/index.ts'
import { onTestFinished } from 'vitest'

export async function scansOver(folder: string, threads = 2): Promise<Scans> {
  const scans = await openScans({ folder, memoryMb: 256, threads })
  onTestFinished(() => scans.close())
  return scans
}

/** Writes rows of a CSV text, time in epoch ms, to Parquet as a staged log has them. `order`: SQL after ORDER BY. */
export async function parquetOf(
  scans: Scans,
  folder: string,
  csv: string,
  order = 'turbine, time',
): Promise<string> {
  const path = join(folder, `rows-${order.replaceAll(/\W/g, '')}.parquet`)
  await writeFile(`${path}.csv`, csv)
  const names = csv.slice(0, csv.indexOf('\n')).split(',')
  const typed = names.map((name) => {
    if (name === 'time') return 'time::BIGINT AS time'
    return ['turbine', 'status'].includes(name) ? name : `${name}::DOUBLE AS ${name}`
  })
  await scans.withConnection((connection) =>
    writeParquet(
      connection,
      `SELECT ${typed.join(', ')} FROM read_csv(${quoteText(`${path}.csv`)}, all_varchar = true) ORDER BY ${order}`,
      path,
    ),
  )
  return path
}
