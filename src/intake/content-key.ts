import { createHash, type Hash } from 'node:crypto'
import { createReadStream } from 'node:fs'
import { InputError } from '../errors.ts'
import type { LogSource } from '../log/index.ts'

/**
 * The logs, each with the SHA-256 of its bytes as they were sent, so that nobody makes it again.
 * @throws InputError LOG_NOT_FOUND
 */
export async function withHashes(logs: readonly LogSource[]): Promise<(LogSource & { sha256: string })[]> {
  const hashed: (LogSource & { sha256: string })[] = []
  for (const log of logs) hashed.push({ ...log, sha256: log.sha256 ?? (await fileHash(log.path)) })
  return hashed
}

/** Equal for the same rows, so that a post that is sent again is known without reading it. */
export function contentKey(hashes: readonly string[], reading: object): string {
  return createHash('sha256')
    .update(hashes.join('\n'))
    .update(`\n${sortedJson(reading)}`)
    .digest('hex')
}

async function fileHash(path: string): Promise<string> {
  const hash: Hash = createHash('sha256')
  try {
    for await (const chunk of createReadStream(path, { highWaterMark: 1024 * 1024 }))
      hash.update(chunk as Buffer)
  } catch (cause) {
    if ((cause as NodeJS.ErrnoException).code !== 'ENOENT') throw cause
    throw new InputError('LOG_NOT_FOUND', `log: expected a file, got none at ${path}`, { cause })
  }
  return hash.digest('hex')
}

/** JSON in which the order of names does not matter. */
function sortedJson(value: unknown): string {
  return JSON.stringify(value, (_, inner: unknown) =>
    typeof inner === 'object' && inner !== null && !Array.isArray(inner)
      ? Object.fromEntries(Object.entries(inner).sort(([a], [b]) => (a < b ? -1 : 1)))
      : inner,
  )
}
