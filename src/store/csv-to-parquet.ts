import { quoteText, type Scans } from '../duck/index.ts'
import { asStorageFull } from './space.ts'

/** `time`: ISO 8601 with offset. */
export type CsvColumn = 'number' | 'integer' | 'text' | 'time'

const TYPES: Readonly<Record<CsvColumn, string>> = {
  number: 'DOUBLE',
  integer: 'BIGINT',
  text: 'VARCHAR',
  time: 'TIMESTAMPTZ',
}

/**
 * Makes a Parquet file of a CSV that this program wrote: header, commas, double quotes, empty = missing. Rows keep their order.
 *
 * @param scans  may read and write both files' folders
 * @param columns  name -> kind, in the order of the header
 * @throws InputError STORAGE_FULL; what was written of the file is the caller's to remove
 */
export async function csvToParquet(
  scans: Scans,
  csvPath: string,
  path: string,
  columns: Readonly<Record<string, CsvColumn>>,
): Promise<void> {
  const types = Object.entries(columns).map(([name, kind]) => `${quoteText(name)}: ${quoteText(TYPES[kind])}`)
  try {
    await scans.withConnection((connection) =>
      connection.run(
        `COPY (SELECT * FROM read_csv(${quoteText(csvPath)}, auto_detect = false, header = true, delim = ',', quote = '"',
           escape = '"', nullstr = '', columns = {${types.join(', ')}}))
         TO ${quoteText(path)} (FORMAT parquet, COMPRESSION zstd)`,
      ),
    )
  } catch (error) {
    throw asStorageFull(error)
  }
}
