import { resolve } from 'node:path'
import { InputError } from '../../errors.ts'
import { duckFailure, openFile, type Bounds, type Connection, type Database } from '../../duck/index.ts'
import type { CatalogueDriver, Row, SqlValue, Transaction } from './driver.ts'
import { MIGRATIONS, VERSIONS_TABLE } from './migrations.ts'

/**
 * Files of catalogues that this process has open. DuckDB's own lock is one of the operating system between processes:
 * it lets the same process in twice, and two instances on one file lose rows that were acknowledged.
 */
const openHere = new Set<string>()

/**
 * Catalogue in one DuckDB file. The file's lock is held until `close`: a second process on the same folder is refused.
 *
 * @throws InputError NOT_READY when another process (or another store of this one) has the file open,
 *   BAD_CONFIG when a newer version of this program wrote it or the file cannot be opened
 */
export async function openDuckdbDriver(
  path: string,
  options: { bounds: Bounds; clock: () => number },
): Promise<CatalogueDriver> {
  const file = resolve(path)
  if (openHere.has(file)) throw inUse(file)
  openHere.add(file)
  try {
    const database = await open(file, options.bounds)
    try {
      await migrate(database, options.clock)
    } catch (error) {
      await database.close()
      throw error
    }
    return new DuckdbDriver(file, options.bounds, database)
  } catch (error) {
    openHere.delete(file)
    throw error
  }
}

class DuckdbDriver implements CatalogueDriver {
  readonly #file: string
  readonly #bounds: Bounds
  #database: Promise<Database>
  /** Settles when the last write in the queue has. */
  #queue: Promise<unknown> = Promise.resolve()
  #closed = false

  constructor(file: string, bounds: Bounds, database: Database) {
    this.#file = file
    this.#bounds = bounds
    this.#database = Promise.resolve(database)
  }

  async query(sql: string, params: readonly SqlValue[] = []): Promise<Row[]> {
    const read = () => this.#use((connection) => connection.records(sql, params))
    try {
      return await read()
    } catch (error) {
      // A write that failed for good took the instance with it; a read has nothing to lose by asking again.
      if (duckFailure(error) === 'fatal') return read()
      throw error
    }
  }

  write<T>(work: (transaction: Transaction) => Promise<T>): Promise<T> {
    const turn = this.#queue.then(() => this.#use((connection) => transact(connection, work)))
    this.#queue = turn.catch(() => undefined)
    return turn
  }

  async close(): Promise<void> {
    if (this.#closed) return
    await this.#queue
    this.#closed = true
    try {
      const database = await this.#database
      // Leaves no write-ahead log behind; when the disk is full the log stays and is read at the next start.
      await database.withConnection((connection) => connection.run('CHECKPOINT')).catch(() => undefined)
      await database.close()
    } finally {
      openHere.delete(this.#file)
    }
  }

  async #use<T>(work: (connection: Connection) => Promise<T>): Promise<T> {
    if (this.#closed) throw new InputError('NOT_READY', 'catalogue: it is closed')
    const opened = this.#database
    const database = await opened.catch((error: unknown) => this.#reopen(opened, error))
    try {
      return await database.withConnection(work)
    } catch (error) {
      if (error instanceof InputError) throw error
      const failure = duckFailure(error)
      if (failure === 'fatal' || failure === 'disk-full') {
        if (await isInvalid(database)) await this.#reopen(opened, error)
      }
      if (failure === 'disk-full') {
        throw new InputError('STORAGE_FULL', 'data folder: expected free space, got a full disk', {
          cause: error,
        })
      }
      throw error
    }
  }

  /** Opens the file again unless somebody else did since `broken` was seen. */
  async #reopen(broken: Promise<Database>, cause: unknown): Promise<Database> {
    if (this.#database === broken) {
      this.#database = (async () => {
        await broken.then(
          (database) => database.close(),
          () => undefined,
        )
        return open(this.#file, this.#bounds)
      })()
      this.#database.catch(() => undefined)
    }
    try {
      return await this.#database
    } catch (error) {
      throw new InputError('NOT_READY', `catalogue: cannot be opened again: ${messageOf(error)}`, { cause })
    }
  }
}

async function transact<T>(
  connection: Connection,
  work: (transaction: Transaction) => Promise<T>,
): Promise<T> {
  await connection.run('BEGIN TRANSACTION')
  try {
    const result = await work({ query: (sql, params = []) => connection.records(sql, params) })
    await connection.run('COMMIT')
    return result
  } catch (error) {
    // After a failed COMMIT there is nothing left to roll back, and that is an error of its own.
    await connection.run('ROLLBACK').catch(() => undefined)
    throw error
  }
}

async function isInvalid(database: Database): Promise<boolean> {
  try {
    await database.withConnection((connection) => connection.records('SELECT count(*) FROM schema_versions'))
    return false
  } catch {
    return true
  }
}

async function open(file: string, bounds: Bounds): Promise<Database> {
  try {
    return await openFile(file, bounds)
  } catch (error) {
    if (/could not set lock|conflicting lock/i.test(messageOf(error))) throw inUse(file, error)
    throw new InputError('BAD_CONFIG', `data folder: cannot open ${file}: ${messageOf(error)}`, {
      cause: error,
    })
  }
}

async function migrate(database: Database, clock: () => number): Promise<void> {
  await database.withConnection(async (connection) => {
    await connection.run(VERSIONS_TABLE)
    const rows = await connection.records('SELECT max(version) AS version FROM schema_versions')
    const present = Number(rows[0]?.['version'] ?? 0)
    const newest = MIGRATIONS.at(-1)!.version
    if (present > newest) {
      throw new InputError(
        'BAD_CONFIG',
        `data folder: expected schema version ${newest} or older, got ${present}: a newer version of this program wrote it`,
      )
    }
    for (const { version, statements } of MIGRATIONS) {
      if (version <= present) continue
      await transact(connection, async (transaction) => {
        for (const statement of statements) await transaction.query(statement)
        await transaction.query('INSERT INTO schema_versions (version, applied_ms) VALUES ($1, $2)', [
          version,
          clock(),
        ])
      })
    }
  })
}

function inUse(file: string, cause?: unknown): InputError {
  return new InputError('NOT_READY', `data folder is in use by another process: ${file} is locked`, { cause })
}

function messageOf(error: unknown): string {
  return error instanceof Error ? error.message : String(error)
}
