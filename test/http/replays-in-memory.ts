import { readFile } from 'node:fs/promises'
import { Readable } from 'node:stream'
import { InputError } from '../../src/errors.ts'
import type {
  OneShotRequest,
  ReplayRecord,
  Replays,
  ReplayStateName,
  RowsFormat,
  StoredRequest,
} from '../../src/replay/contract.ts'
import { newestProofs } from '../../src/replay/trend/newest-proofs.ts'
import { trendOf } from '../../src/replay/trend/trend.ts'
import { whatIsNew } from '../../src/replay/trend/what-is-new.ts'
import type { ScoreSheet } from '../../src/sheet/index.ts'
import { sheetExample } from './sheet-example.ts'

/** Keeps what it is asked, reads the logs, and answers a made-up sheet: what is tested is the way there and back. */
export class ReplaysInMemory implements Replays {
  readonly requests: OneShotRequest[] = []
  readonly bodies: Buffer[][] = []
  readonly stores: StoredRequest[] = []
  readonly records = new Map<string, ReplayRecord>()
  /** What the next one-shot throws. */
  failure: Error | undefined
  #next = 1

  async oneShot(request: OneShotRequest) {
    this.requests.push(request)
    this.bodies.push(await Promise.all(request.logs.map((log) => readFile(log.path))))
    if (this.failure !== undefined) throw this.failure
    const id = `replay-${this.#next++}`
    const sheet = sheetExample(id)
    // Two spaces of indent: an answer that is the same byte for byte can only have come from here.
    this.add({ id, state: 'done', finishedMs: 2_000, sheet: JSON.stringify(sheet, null, 2) })
    return sheet
  }

  /** Sheets of stored logs, in the order they are answered; the last one again and again. */
  readonly sheets = [sheetExample('stored-1')]

  stored(request: StoredRequest) {
    this.stores.push(request)
    if (this.failure !== undefined) return Promise.reject(this.failure)
    const sheet = this.sheets[Math.min(this.stores.length, this.sheets.length) - 1] ?? sheetExample('none')
    this.add({
      id: sheet.replay,
      site: request.site,
      state: 'done',
      finishedMs: 2_000,
      sheet: JSON.stringify(sheet),
    })
    return Promise.resolve(sheet)
  }

  start(request: StoredRequest) {
    this.stores.push(request)
    const id = `started-${this.#next++}`
    this.add({ id, site: request.site, state: 'queued' })
    return Promise.resolve({ id })
  }

  async rows(id: string, format: RowsFormat) {
    const { sheet } = await this.get(id)
    if (sheet === null)
      throw new InputError('REPLAY_NOT_FOUND', `replay: expected a finished one, got "${id}"`)
    const mediaType = { csv: 'text/csv', parquet: 'application/vnd.apache.parquet', arrow: 'x' }[format]
    return { stream: Readable.from([Buffer.from(`rows of ${id} as ${format}\n`)]), mediaType }
  }

  trend(site: string, page: { replays: number }) {
    return Promise.resolve(trendOf(site, this.#sheets(site).slice(0, page.replays)))
  }

  async news(id: string) {
    const { site } = await this.get(id)
    const sheets = this.#sheets(site)
    const at = sheets.findIndex(({ replay }) => replay === id)
    return at < 0 ? null : whatIsNew(sheets[at]!, sheets[at + 1] ?? null)
  }

  proofs(site: string) {
    return Promise.resolve(newestProofs(this.#sheets(site)))
  }

  /** Those added last first. */
  #sheets(site: string | null): ScoreSheet[] {
    return [...this.records.values()]
      .filter((record) => record.site === site && record.sheet !== null)
      .map((record) => JSON.parse(record.sheet ?? '') as ScoreSheet)
      .reverse()
  }

  close() {
    return Promise.resolve()
  }

  add(record: Partial<ReplayRecord> & { id: string }): void {
    const blank = {
      state: 'queued',
      site: null,
      createdMs: 1_000,
      finishedMs: null,
      sheet: null,
      problem: null,
      progress: null,
    } as const
    this.records.set(record.id, { ...blank, ...record })
  }

  get(id: string): Promise<ReplayRecord> {
    const record = this.records.get(id)
    if (record === undefined) {
      return Promise.reject(new InputError('REPLAY_NOT_FOUND', `replay: expected a known id, got "${id}"`))
    }
    return Promise.resolve(record)
  }

  list(page: { after?: string; limit: number; site?: string; state?: ReplayStateName }) {
    const { after, limit, site, state } = page
    const all = [...this.records.values()]
      .filter((record) => site === undefined || record.site === site)
      .filter((record) => state === undefined || record.state === state)
    const start = after === undefined ? 0 : all.findIndex((record) => record.id === after) + 1
    const replays = all.slice(start, start + limit)
    const next = start + limit < all.length ? (replays.at(-1)?.id ?? null) : null
    return Promise.resolve({ replays, next })
  }

  async remove(id: string): Promise<void> {
    await this.get(id)
    this.records.delete(id)
  }
}
