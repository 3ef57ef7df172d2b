import { quoteIdentifier, quoteText, type Connection } from '../duck/index.ts'
import { TEXT_CHANNELS } from '../sheet/index.ts'
import { limitsOf, type CleanFile } from './clean-file.ts'
import { convert } from './units.ts'

/** Numbers that loggers write where they have no value. */
const SENTINELS = [-999, -9999, -99_999, 9999, 99_999, 32_767, -32_768, 65_535]

/**
 * Values that stand for no value although they lie within the limits of their channel: a well-known sentinel, as written in the
 * log, beyond the range of all other values of the channel by more than its width. A channel without other values has none.
 *
 * @param path  staged rows.
 * @returns channel -> values, canonical unit.
 */
export async function findSentinels(
  connection: Connection,
  path: string,
  files: readonly CleanFile[],
  channels: readonly string[],
): Promise<Map<string, readonly number[]>> {
  const found = new Map<string, readonly number[]>()
  const suspects = channels
    .map((channel) => ({ channel, values: within(files, channel) }))
    .filter(({ values }) => values.length > 0)
  if (suspects.length === 0) return found
  const staged = `read_parquet(${quoteText(path)})`
  const ends = suspects.map(({ channel }, i) => {
    const name = quoteIdentifier(channel)
    return `min(${name}) AS low${i}, max(${name}) AS high${i}`
  })
  const [outer] = await connection.records(`SELECT ${ends.join(', ')} FROM ${staged}`)
  for (const [i, { channel, values }] of suspects.entries()) {
    // One that is neither end lies within the range of the others.
    if (!values.some((value) => value === outer![`low${i}`] || value === outer![`high${i}`])) continue
    const name = quoteIdentifier(channel)
    const isOne = `${name} IN (${values.map((value) => `${value}::DOUBLE`).join(', ')})`
    const [inner] = await connection.records(
      `SELECT min(${name}) FILTER (NOT ${isOne}) AS low, max(${name}) FILTER (NOT ${isOne}) AS high FROM ${staged}`,
    )
    const { low, high } = inner!
    if (typeof low !== 'number' || typeof high !== 'number') continue
    const width = high - low
    const beyond = values.filter((value) => value < low - width || value > high + width)
    if (beyond.length > 0) found.set(channel, beyond)
  }
  return found
}

/** Sentinels as the units of the files make them, as far as the limits of the channel let them pass. */
function within(files: readonly CleanFile[], channel: string): number[] {
  if ((TEXT_CHANNELS as readonly string[]).includes(channel)) return []
  const { min, max } = limitsOf(channel)
  const values = files.flatMap((file) => {
    const unit = file.channels.find((column) => column.takenFor === channel)?.unit
    return unit ? SENTINELS.map((one) => convert(one, unit)) : []
  })
  return [...new Set(values)].filter((value) => value >= min && value <= max)
}
