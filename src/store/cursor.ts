import { InputError } from '../errors.ts'

/** Where a page of a list ended: lists go from newest to oldest, equal times by id. */
export interface Cursor {
  readonly ms: number
  readonly id: string
}

export function writeCursor(cursor: Cursor): string {
  return Buffer.from(`${cursor.ms} ${cursor.id}`).toString('base64url')
}

/** @throws InputError BAD_REQUEST for a text that `writeCursor` did not make */
export function readCursor(text: string): Cursor {
  const match = /^(\d{1,16}) ([A-Za-z0-9_-]{1,100})$/.exec(Buffer.from(text, 'base64url').toString())
  const ms = Number(match?.[1])
  if (!match || !Number.isSafeInteger(ms)) {
    throw new InputError(
      'BAD_REQUEST',
      `cursor: expected the "next" of the page before, got "${text.slice(0, 120)}"`,
    )
  }
  return { ms, id: match[2]! }
}
