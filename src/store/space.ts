import { readdir, stat, statfs } from 'node:fs/promises'
import { join } from 'node:path'
import { duckFailure } from '../duck/index.ts'
import { InputError } from '../errors.ts'
import { isCode } from './durable-file.ts'

export interface SpaceLimits {
  /** Most bytes that frames, segments and rejected rows may take together; undefined: as much as the disk has. */
  readonly limitBytes?: number
  /** Bytes of the disk that stay free, so that the catalogue can always write down what happened. Default 64 MB. */
  readonly keepFreeBytes?: number
}

/** The account of bytes in the data folder. */
export interface Space {
  /**
   * Sets bytes aside for files that are about to be kept.
   * @throws InputError STORAGE_FULL when they do not fit; then nothing is set aside
   */
  reserve(bytes: number): Promise<void>
  release(bytes: number): void
  /** Runs `work`; when it fails, the bytes set aside for it are released and a full disk becomes STORAGE_FULL. */
  guard<T>(bytes: number, work: () => Promise<T>): Promise<T>
  readonly usedBytes: number
}

const KEEP_FREE_BYTES = 64 * 1024 * 1024

/** @param counted  folders whose files count against `limitBytes` */
export async function openSpace(
  folder: string,
  counted: readonly string[],
  limits: SpaceLimits,
): Promise<Space> {
  const keepFree = limits.keepFreeBytes ?? KEEP_FREE_BYTES
  const limit = limits.limitBytes ?? Infinity
  let used = 0
  for (const path of counted) used += await bytesBelow(path)
  const release = (bytes: number) => {
    used = Math.max(0, used - bytes)
  }
  return {
    get usedBytes() {
      return used
    },
    async reserve(bytes) {
      const disk = await statfs(folder)
      const free = disk.bavail * disk.bsize
      if (!(used + bytes <= limit)) {
        throw full(`at most ${limit} bytes`, `${used} bytes and ${bytes} more`)
      }
      if (!(free - bytes >= keepFree)) {
        throw full(`${keepFree} bytes of the disk to stay free`, `${free} free and ${bytes} to be written`)
      }
      used += bytes
    },
    release,
    async guard(bytes, work) {
      try {
        return await work()
      } catch (error) {
        release(bytes)
        throw asStorageFull(error)
      }
    },
  }
}

/** A full disk, however it was reported, as STORAGE_FULL; any other error as it is. */
export function asStorageFull(error: unknown): unknown {
  if (error instanceof InputError) return error
  const isFull = isCode(error, 'ENOSPC') || isCode(error, 'EDQUOT') || duckFailure(error) === 'disk-full'
  if (!isFull) return error
  return new InputError('STORAGE_FULL', 'data folder: expected free space, got a full disk', { cause: error })
}

async function bytesBelow(folder: string): Promise<number> {
  let bytes = 0
  for (const entry of await readdir(folder, { withFileTypes: true, recursive: true })) {
    if (entry.isFile()) bytes += (await stat(join(entry.parentPath, entry.name))).size
  }
  return bytes
}

function full(expected: string, got: string): InputError {
  return new InputError('STORAGE_FULL', `data folder: expected ${expected}, got ${got}`)
}
