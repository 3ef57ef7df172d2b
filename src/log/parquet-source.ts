import { createWriteStream } from 'node:fs'
import { rm } from 'node:fs/promises'
import { join } from 'node:path'
import { pipeline } from 'node:stream/promises'
import { InputError } from '../errors.ts'
import { quoteIdentifier, quoteText, type Scans } from '../duck/index.ts'
import type { LogLimits, LogParts, LogSource } from './contract.ts'
import { sourceBytes } from './source-bytes.ts'

/** A source as it is read: a Parquet file is read as the text made of it, and keeps the checksum of what was sent. */
export type ReadableSource = LogSource

/**
 * Turns a Parquet file into delimited text, so that one reader does for all; other sources pass unchanged.
 * Line numbers are then row numbers plus one, for the header.
 *
 * @param working  the text file is added: the caller removes it.
 * @throws InputError LOG_CORRUPT when it cannot be read as Parquet
 */
export async function readableSource(
  source: LogSource,
  index: number,
  parts: LogParts,
  working: string[],
): Promise<ReadableSource> {
  if (!(await isParquet(source, parts.limits))) return source
  // The scans may only read their own folder, and the sender's bytes are hashed on the way.
  const copy = join(parts.folder, `sent-${index}.parquet`)
  const path = join(parts.folder, `sent-${index}.csv`)
  working.push(copy, path)
  const bytes = await sourceBytes(source, parts.limits)
  await pipeline(bytes.chunks, createWriteStream(copy))
  try {
    await writeText(parts.scans, copy, path)
  } catch (error) {
    if (
      !/^(Invalid|IO|Serialization)\b.*(parquet|thrift|magic|snappy|too small)/is.test(
        (error as Error).message,
      )
    )
      throw error
    throw new InputError(
      'LOG_CORRUPT',
      `${source.name}: expected a Parquet file, got one that cannot be read; send it again`,
      {
        cause: error,
      },
    )
  } finally {
    await rm(copy, { force: true })
  }
  return { name: source.name, path, sha256: bytes.sha256() }
}

async function isParquet(source: LogSource, limits: LogLimits): Promise<boolean> {
  // Opened by the common way first: it says what is wrong with a path.
  const { chunks } = await sourceBytes(source, limits)
  for await (const chunk of chunks) return chunk.subarray(0, 4).toString('latin1') === 'PAR1'
  return false
}

async function writeText(scans: Scans, from: string, to: string): Promise<void> {
  await scans.withConnection(async (connection) => {
    const table = `read_parquet(${quoteText(from)})`
    const columns = await connection.records(
      `SELECT column_name, column_type FROM (DESCRIBE SELECT * FROM ${table})`,
    )
    const list = columns.map((column) => {
      const name = quoteIdentifier(String(column['column_name']))
      const type = String(column['column_type'])
      if (type === 'BOOLEAN') return `${name}::INTEGER AS ${name}`
      return `translate(${name}::VARCHAR, chr(10) || chr(13), '  ') AS ${name}`
    })
    await connection.run(
      `COPY (SELECT ${list.join(', ')} FROM ${table}) TO ${quoteText(to)} (FORMAT csv, HEADER, DELIMITER ',')`,
    )
  })
}
