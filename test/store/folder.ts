import { spawnSync } from 'node:child_process'
import { mkdtemp, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { onTestFinished } from 'vitest'
import { openStore, type Store, type StoreOptions } from '../../src/store/index.ts'

export async function makeFolder(): Promise<string> {
  const folder = await mkdtemp(join(tmpdir(), 'yawledger-store-'))
  onTestFinished(() => rm(folder, { recursive: true, force: true }))
  return folder
}

/** A store whose clock stands still unless the test moves it, closed when the test ends. */
export async function openTestStore(folder: string, options: Partial<StoreOptions> = {}): Promise<Store> {
  const store = await openStore({
    folder,
    clock: () => 1_000,
    newId: counter(),
    keepFreeBytes: 0,
    ...options,
  })
  onTestFinished(() => store.close())
  return store
}

export function counter(prefix = 'id'): () => string {
  let n = 0
  return () => `${prefix}${String(++n).padStart(6, '0')}`
}

/** A file system of its own, so small that it can be filled; undefined where this user may not mount one. */
export async function makeSmallDisk(megabytes: number): Promise<string | undefined> {
  const folder = await makeFolder()
  const mounted = spawnSync('mount', ['-t', 'tmpfs', '-o', `size=${megabytes}m`, 'tmpfs', folder])
  if (mounted.status !== 0) return undefined
  onTestFinished(() => void spawnSync('umount', ['-l', folder]))
  return folder
}
