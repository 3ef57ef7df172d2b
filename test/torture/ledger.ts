import { isDeepStrictEqual } from 'node:util'
import type { RowsOfLog } from './rows-in-files.ts'

export const SITE = 'quern-hill'
export const TURBINES = ['Q01', 'Q02']

/** A stored log as the service answers it. */
export interface StoredLog {
  readonly batch: string
  readonly receipt: { readonly accepted: number; readonly rejected: number }
}

/** A log that was sent. Its rows are of every turbine and minute; each row names the log by its number. */
export interface SentLog {
  readonly n: number
  readonly firstMs: number
  readonly minutes: number
  /** Whether one of its lines is no row. */
  readonly hasRejected: boolean
}

type State = 'unsure' | 'stored' | 'removing' | 'removed'

/** What was sent to a service and what it acknowledged: what must be there, what may, and what must not. */
export class Ledger {
  readonly #logs = new Map<number, SentLog>()
  readonly #states = new Map<number, State>()
  readonly #answers = new Map<number, StoredLog>()
  readonly #numbers = new Map<string, number>()
  /** Numbers of the stored logs, earliest first, as the service lists them. */
  #order: number[] = []
  /** Replay -> score sheet as it was first answered. */
  readonly sheets = new Map<string, string>()
  nextMinute = 0
  acknowledgements = 0
  #nextNumber = 1

  nextNumber(): number {
    return this.#nextNumber++
  }

  sending(log: SentLog): void {
    this.#logs.set(log.n, log)
    this.#states.set(log.n, 'unsure')
  }

  refused(n: number): void {
    this.#states.set(n, 'removed')
  }

  acknowledged(n: number, answer: StoredLog): void {
    this.acknowledgements++
    this.#states.set(n, 'stored')
    this.#answers.set(n, answer)
    this.#numbers.set(answer.batch, n)
  }

  removing(n: number): string {
    this.#states.set(n, 'removing')
    return this.#answers.get(n)!.batch
  }

  removed(n: number): void {
    this.#states.set(n, 'removed')
  }

  stored(): SentLog[] {
    return [...this.#logs.values()].filter(({ n }) => this.#states.get(n) === 'stored')
  }

  known(): SentLog[] {
    return [...this.#logs.values()]
  }

  /** Takes what is listed (newest first) for what became of the logs whose answer never came. Answers what is impossible. */
  settle(listed: readonly StoredLog[]): string[] {
    const problems: string[] = []
    for (const one of listed) {
      const n = this.#numbers.get(one.batch) ?? this.#numberOf(one)
      if (n === undefined) {
        problems.push(`${one.batch} was never sent: ${JSON.stringify(one).slice(0, 300)}`)
        continue
      }
      const state = this.#states.get(n)
      if (state === 'unsure') {
        this.acknowledged(n, one)
        const expected = this.#logs.get(n)!.minutes * TURBINES.length
        if (one.receipt.accepted !== expected) {
          problems.push(`log ${n}: ${one.receipt.accepted} of ${expected} rows in the receipt`)
        }
      } else if (state === 'removing') this.#states.set(n, 'stored')
      else if (state === 'removed') problems.push(`log ${n} was removed, and is there`)
    }
    for (const [n, state] of this.#states) {
      if (state === 'unsure' || state === 'removing') this.#states.set(n, 'removed')
    }
    this.#order = listed.map(({ batch }) => this.#numbers.get(batch) ?? NaN).reverse()
    // A log that was listed twice, or not at all, does not pass `differing`.
    return problems
  }

  /** Stored logs that are not listed exactly as they were first answered. */
  differing(listed: readonly StoredLog[]): string[] {
    const byBatch = new Map(listed.map((one) => [one.batch, one]))
    const stored = this.stored()
    const problems = stored
      .filter(({ n }) => {
        const answer = this.#answers.get(n)!
        return !isDeepStrictEqual(byBatch.get(answer.batch), answer)
      })
      .map(({ n }) => `log ${n} is not there as it was answered`)
    if (listed.length !== stored.length) problems.push(`${listed.length} listed, ${stored.length} stored`)
    return problems
  }

  turbines(): readonly string[] {
    return this.stored().length > 0 ? TURBINES : []
  }

  /** Different minutes of the stored logs; a log is either on the same minutes as another one or on none of them. */
  coveredMinutes(): number {
    return [...this.#winners().values()].reduce((sum, { minutes }) => sum + minutes, 0)
  }

  rejectedFiles(): string[] {
    return this.stored()
      .filter(({ hasRejected }) => hasRejected)
      .map(({ n }) => `${this.#answers.get(n)!.batch}.csv`)
  }

  /**
   * @param options.countsOverruled  true where all rows lie (those of removed logs may lie there too, until they are merged
   *   away), false where only the rows of the last log at a time count
   */
  wrongRows(found: readonly RowsOfLog[], { countsOverruled }: { countsOverruled: boolean }): string[] {
    const byNumber = new Map(found.map((one) => [one.n, one]))
    const winners = new Set([...this.#winners().values()].map(({ n }) => n))
    const problems: string[] = []
    for (const { n } of found) if (!this.#logs.has(n)) problems.push(`rows of log ${n}, which was never sent`)
    for (const { n, minutes } of this.#logs.values()) {
      const rows = byNumber.get(n)
      const whole = minutes * TURBINES.length
      const isStored = this.#states.get(n) === 'stored'
      const isDue = countsOverruled ? isStored : winners.has(n)
      const mayLie = countsOverruled && this.#states.get(n) === 'removed' && this.#answers.has(n)
      if (
        rows === undefined
          ? !isDue
          : rows.rows === whole && rows.right === whole && rows.keys === whole && (isDue || mayLie)
      )
        continue
      problems.push(
        `log ${n} (${this.#states.get(n) ?? ''}): expected ${isDue ? whole : 0} rows, got ${JSON.stringify(rows)}`,
      )
    }
    return problems
  }

  describe(): string {
    const stored = this.stored()
    const minutes = stored.reduce((sum, log) => sum + log.minutes, 0)
    return `${this.#logs.size} logs sent, ${stored.length} stored with ${minutes * TURBINES.length} rows, ${this.sheets.size} sheets`
  }

  /** First minute -> the last stored log on it. */
  #winners(): Map<number, SentLog> {
    const winners = new Map<number, SentLog>()
    for (const n of this.#order) {
      const log = this.#logs.get(n)
      if (log) winners.set(log.firstMs, log)
    }
    return winners
  }

  /** Logs carry their number in the name that they were sent by. */
  #numberOf(log: StoredLog): number | undefined {
    const n = Number(/"name":"log-(\d+)\.csv"/.exec(JSON.stringify(log.receipt))?.[1])
    return this.#logs.has(n) ? n : undefined
  }
}
