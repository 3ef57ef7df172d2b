import { quoteIdentifier, streamColumns, type Connection } from '../../duck/index.ts'
import { BIN_SQL } from './high-rate.ts'

/**
 * The text that most rows of an interval hold; of equally long ones the first in byte order. Missing texts do not count.
 *
 * @param source  SQL after FROM, rows of one turbine with `time`
 * @returns start of the interval, epoch ms -> text; intervals without any are not in it.
 */
export async function longestTexts(
  connection: Connection,
  source: string,
  where: string,
  column: string,
): Promise<Map<number, string>> {
  const name = quoteIdentifier(column)
  const counted = `(SELECT ${BIN_SQL} AS bin, ${name} AS held, count(*) AS row_count FROM ${source}
    WHERE ${where} AND ${name} IS NOT NULL GROUP BY 1, 2)`
  const longest = new Map<number, string>()
  for await (const { rows, columns } of streamColumns(
    connection,
    counted,
    { bin: 'number', held: 'text' },
    { orderBy: 'bin, row_count DESC, held COLLATE "C"' },
  )) {
    for (let i = 0; i < rows; i++) {
      const bin = columns.bin[i]!
      if (!longest.has(bin)) longest.set(bin, columns.held[i]!)
    }
  }
  return longest
}
