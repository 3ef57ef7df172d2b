import { open, type FileHandle } from 'node:fs/promises'
import type { Receipt } from '../sheet/index.ts'

/** Why a row was rejected. */
export type RejectReason =
  | 'field-count'
  | 'quote'
  | 'not-text'
  | 'json'
  | 'no-time'
  | 'bad-time'
  | 'spring-gap'
  | 'no-turbine'
  | 'bad-turbine'
  | 'no-values'

const FIRST_TEXT = 200
const FLUSH_CHARACTERS = 1024 ** 2

/** Collects rejected rows in a CSV file (file, line, reason, text), made at the first one, and counts them by reason. */
export class Rejects {
  rows = 0
  private readonly path: string
  private readonly byReason = new Map<RejectReason, { rows: number; firstLine: number; firstText: string }>()
  private file: FileHandle | null = null
  private waiting: string[] = []
  private characters = 0

  constructor(path: string) {
    this.path = path
  }

  add(file: string, line: number, reason: RejectReason, text: string): void {
    this.rows++
    const entry = this.byReason.get(reason)
    if (entry) entry.rows++
    else this.byReason.set(reason, { rows: 1, firstLine: line, firstText: text.slice(0, FIRST_TEXT) })
    const row = `${quote(file)},${line},${reason},${quote(text)}\n`
    this.waiting.push(row)
    this.characters += row.length
  }

  /** To be awaited now and then, so that waiting rows do not pile up. */
  async flush(force = false): Promise<void> {
    if (this.waiting.length === 0 || (!force && this.characters < FLUSH_CHARACTERS)) return
    if (!this.file) {
      this.file = await open(this.path, 'w')
      await this.file.write('file,line,reason,text\n')
    }
    await this.file.write(this.waiting.join(''))
    this.waiting = []
    this.characters = 0
  }

  /** @returns the file; null when no row was rejected. */
  async close(): Promise<string | null> {
    await this.flush(true)
    await this.file?.close()
    const made = this.file !== null
    this.file = null
    return made ? this.path : null
  }

  counts(): Receipt['rejectedByReason'] {
    return [...this.byReason].map(([reason, entry]) => ({ reason, ...entry }))
  }

  count(reason: RejectReason): { rows: number; firstLine: number; firstText: string } | undefined {
    return this.byReason.get(reason)
  }
}

function quote(text: string): string {
  return /[",\n\r]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text
}
