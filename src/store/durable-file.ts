import { constants } from 'node:fs'
import { copyFile, open, rename, rm } from 'node:fs/promises'
import { dirname } from 'node:path'

/**
 * Moves a finished file to its place so that after a crash it is there whole or not at all: content synced, renamed,
 * folder synced. An older file at `to` is replaced.
 */
export async function moveDurably(from: string, to: string): Promise<void> {
  await syncFile(from)
  try {
    await rename(from, to)
  } catch (error) {
    if (!isCode(error, 'EXDEV')) throw error
    // Staged on another disk: copied beside its place first, since only a rename is all or nothing.
    const beside = `${to}.partial`
    await copyFile(from, beside, constants.COPYFILE_FICLONE)
    await syncFile(beside)
    await rename(beside, to)
    await rm(from, { force: true })
  }
  await syncFolder(dirname(to))
}

/** Removes a file so that it stays removed after a crash. True when there was one. */
export async function removeDurably(path: string): Promise<boolean> {
  try {
    await rm(path)
  } catch (error) {
    if (isCode(error, 'ENOENT')) return false
    throw error
  }
  await syncFolder(dirname(path))
  return true
}

export async function syncFile(path: string): Promise<void> {
  const handle = await open(path, 'r+')
  try {
    await handle.sync()
  } finally {
    await handle.close()
  }
}

export async function syncFolder(path: string): Promise<void> {
  const handle = await open(path, 'r')
  try {
    await handle.sync()
  } finally {
    await handle.close()
  }
}

export function isCode(error: unknown, code: string): boolean {
  return error instanceof Error && (error as NodeJS.ErrnoException).code === code
}
