import { createHash } from 'node:crypto'
import type { TSchema } from 'typebox'
import { InputError } from '../errors.ts'
import { SiteFile } from '../sheet/index.ts'
import { checkShape } from './check-shape.ts'

/** The lists of a site file that grow entry by entry. */
export type EntryList = 'corrections' | 'events' | 'exclude'

type Entry<L extends EntryList> = NonNullable<SiteFile[L]>[number]

/** An entry and its id, which follows from what the entry says: the same entry has the same id in any document. */
export type SiteEntry<L extends EntryList> = Entry<L> & { readonly id: string }

/**
 * One entry as it came in.
 * @throws InputError BAD_SITE
 */
export function checkEntry<L extends EntryList>(list: L, value: unknown): SiteEntry<L> {
  const schema = SiteFile.properties[list].items as TSchema
  return withId(checkShape(schema, value, { code: 'BAD_SITE', place: list }) as Entry<L>)
}

/** Entries by time, equal times in the order of the document. */
export function entriesOf<L extends EntryList>(file: SiteFile, list: L): SiteEntry<L>[] {
  const entries = (file[list] ?? []) as Entry<L>[]
  return entries.map(withId).sort((a, b) => timeOf(a) - timeOf(b))
}

/** The file with the entry at its place in time. */
export function withEntry<L extends EntryList>(file: SiteFile, list: L, entry: SiteEntry<L>): SiteFile {
  return withEntries(
    file,
    list,
    [...entriesOf(file, list), entry].sort((a, b) => timeOf(a) - timeOf(b)),
  )
}

/** @throws InputError ENTRY_NOT_FOUND */
export function withoutEntry(file: SiteFile, list: EntryList, id: string): SiteFile {
  const entries = entriesOf(file, list)
  const kept = entries.filter((entry) => entry.id !== id)
  if (kept.length === entries.length) {
    throw new InputError(
      'ENTRY_NOT_FOUND',
      `id: expected that of an entry under ${list} of site "${file.site ?? ''}", got "${id.slice(0, 100)}"`,
    )
  }
  return withEntries(file, list, kept)
}

function withEntries(file: SiteFile, list: EntryList, entries: readonly { id: string }[]): SiteFile {
  const bare = entries.map((entry) =>
    Object.fromEntries(Object.entries(entry).filter(([name]) => name !== 'id')),
  )
  return { ...file, [list]: bare }
}

function withId<E extends object>(entry: E): E & { id: string } {
  const sorted = Object.entries(entry).sort(([a], [b]) => (a < b ? -1 : 1))
  return { id: createHash('sha256').update(JSON.stringify(sorted)).digest('hex').slice(0, 16), ...entry }
}

function timeOf(entry: object): number {
  const { at, from } = entry as { at?: string; from?: string }
  return Date.parse(at ?? from ?? '')
}
