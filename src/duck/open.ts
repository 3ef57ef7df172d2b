import { mkdir } from 'node:fs/promises'
import { resolve } from 'node:path'
import { DuckDBInstance } from '@duckdb/node-api'
import { wrapConnection, type Connection } from './connection.ts'
import { quoteTexts } from './quote.ts'

export interface Bounds {
  /** Memory of the buffer manager, MB. Beyond it sorts spill to the temporary folder. */
  readonly memoryMb: number
  readonly threads: number
  /** Folder for spilled data; made when absent. Inside the data folder. */
  readonly tempFolder: string
  /** Folders whose files statements may read and write; everything else is refused. */
  readonly allowedFolders: readonly string[]
}

/** An opened database. */
export interface Database {
  /** Gives `work` a connection of its own and closes it afterwards, whatever happened. */
  withConnection<T>(work: (connection: Connection) => Promise<T>): Promise<T>
  /** A connection that stays open until its `close`; for one that outlives a call. */
  connect(): Promise<Connection & { close(): void }>
  /** Waits for connections in use, then closes. Later calls of `withConnection` reject. */
  close(): Promise<void>
}

/** In-memory instance for scans over files: several connections may use it at once; tables are temporary ones. */
export type Scans = Database

/**
 * Opens an in-memory instance for scans, bounded in memory, threads and reach.
 *
 * @param options.folder  spilled data goes to `<folder>/duck-temp`; files in `folder` may be read and written.
 * @param options.allowedFolders  further folders that may be read and written.
 */
export async function openScans(options: {
  folder: string
  memoryMb: number
  threads: number
  allowedFolders?: readonly string[]
}): Promise<Scans> {
  const folder = resolve(options.folder)
  return open(':memory:', {
    memoryMb: options.memoryMb,
    threads: options.threads,
    tempFolder: resolve(folder, 'duck-temp'),
    allowedFolders: [folder, ...(options.allowedFolders ?? [])],
  })
}

/**
 * Opens a database file, with write-ahead log beside it. One instance per process and file: a second one loses rows
 * that the first one acknowledged. Never opened by a worker.
 */
export async function openFile(path: string, bounds: Bounds): Promise<Database> {
  return open(resolve(path), bounds)
}

async function open(path: string, bounds: Bounds): Promise<Database> {
  if (!(bounds.memoryMb >= 16)) throw new Error(`memoryMb: expected >= 16, got ${bounds.memoryMb}`)
  if (!(Number.isInteger(bounds.threads) && bounds.threads >= 1)) {
    throw new Error(`threads: expected a whole number >= 1, got ${bounds.threads}`)
  }
  const tempFolder = resolve(bounds.tempFolder)
  await mkdir(tempFolder, { recursive: true })
  const instance = await DuckDBInstance.create(path, {
    memory_limit: `${Math.floor(bounds.memoryMb)}MB`,
    threads: String(bounds.threads),
    temp_directory: tempFolder,
    autoinstall_known_extensions: 'false',
    autoload_known_extensions: 'false',
    allow_community_extensions: 'false',
  })
  try {
    await lock(instance, [...bounds.allowedFolders.map((folder) => resolve(folder)), tempFolder])
  } catch (error) {
    instance.closeSync()
    throw error
  }
  return database(instance)
}

/** The order matters: the folders are named, then everything else is shut, then nothing can be opened again. */
async function lock(instance: DuckDBInstance, folders: readonly string[]): Promise<void> {
  const connection = await instance.connect()
  try {
    await connection.run(`SET allowed_directories = ${quoteTexts(folders)}`)
    await connection.run('SET enable_external_access = false')
    await connection.run('SET enable_progress_bar = false')
    await connection.run('SET lock_configuration = true')
  } finally {
    connection.closeSync()
  }
}

function database(instance: DuckDBInstance): Database {
  let closing: Promise<void> | undefined
  const inUse = new Set<Promise<unknown>>()
  const connect = async () => {
    if (closing) throw new Error('the database is closed')
    // Counted before the first await, so that a close that comes in between waits for it.
    let done = (): void => undefined
    const held = new Promise<void>((resolved) => (done = resolved))
    inUse.add(held)
    const release = () => {
      inUse.delete(held)
      done()
    }
    let native
    try {
      native = await instance.connect()
    } catch (error) {
      release()
      throw error
    }
    const connection = native
    let open = true
    const close = () => {
      if (!open) return
      open = false
      connection.closeSync()
      release()
    }
    return { ...wrapConnection(connection), close }
  }
  return {
    connect,
    async withConnection(work) {
      const connection = await connect()
      try {
        return await work(connection)
      } finally {
        connection.close()
      }
    },
    close() {
      closing ??= (async () => {
        while (inUse.size > 0) await Promise.all(inUse)
        instance.closeSync()
      })()
      return closing
    },
  }
}
