import { InputError } from '../errors.ts'
import type { CatalogueDriver, Row } from './catalogue/driver.ts'
import { readCursor, writeCursor } from './cursor.ts'
import { checkId, isId } from './ids.ts'

/** A replay as the catalogue knows it. */
export interface StoredReplay {
  readonly id: string
  readonly state: 'queued' | 'running' | 'done' | 'failed' | 'cancelled'
  readonly site: string | null
  readonly createdMs: number
  readonly finishedMs: number | null
  /** The score sheet as JSON text, byte for byte as it was first answered; null until done. */
  readonly sheet: string | null
  readonly problem: { readonly code: string; readonly detail: string } | null
}

export interface ReplayStore {
  /** Notes a replay as running. Epoch milliseconds, whole. */
  begin(replay: { id: string; site: string | null; createdMs: number }): Promise<void>
  /**
   * Keeps the sheet and the state `done` together. Resolves when they are on disk.
   * @throws InputError REPLAY_NOT_FOUND when it is not running (any more), STORAGE_FULL
   */
  finish(id: string, sheet: string, finishedMs: number): Promise<void>
  /** @throws InputError REPLAY_NOT_FOUND when it is not running (any more) */
  fail(id: string, problem: { code: string; detail: string }, finishedMs?: number): Promise<void>
  /** @throws InputError REPLAY_NOT_FOUND when it is not running (any more) */
  cancel(id: string, finishedMs?: number): Promise<void>
  get(id: string): Promise<StoredReplay | undefined>
  /**
   * Newest first. `next` is the cursor of the following page, null on the last one.
   * @param page.limit  1 to 1000
   * @param page.sheets  false leaves `sheet` null, for lists that do not show it; default true
   * @throws InputError BAD_REQUEST for a cursor of another origin
   */
  list(page: {
    after?: string
    limit: number
    sheets?: boolean
  }): Promise<{ replays: StoredReplay[]; next: string | null }>
  /** True when there was one. Its frame is removed by `frames.remove`. */
  remove(id: string): Promise<boolean>
}

const COLUMNS = 'r.id, r.state, r.site, r.created_ms, r.finished_ms, r.problem_code, r.problem_detail'

export function replayStore(driver: CatalogueDriver, clock: () => number): ReplayStore {
  const end = (id: string, state: string, finishedMs: number, problem?: { code: string; detail: string }) =>
    driver.write(async (transaction) => {
      const changed = await transaction.query(
        `UPDATE replays SET state = $2, finished_ms = $3, problem_code = $4, problem_detail = $5
         WHERE id = $1 AND state IN ('queued', 'running') RETURNING id`,
        [id, state, finishedMs, problem?.code ?? null, problem?.detail ?? null],
      )
      if (changed.length === 0) throw notRunning(id)
    })
  return {
    async begin({ id, site, createdMs }) {
      checkId(id)
      await driver.write((transaction) =>
        transaction.query(
          `INSERT INTO replays (id, state, site, created_ms) VALUES ($1, 'running', $2, $3)`,
          [id, site, createdMs],
        ),
      )
    },
    async finish(id, sheet, finishedMs) {
      await driver.write(async (transaction) => {
        const changed = await transaction.query(
          `UPDATE replays SET state = 'done', finished_ms = $2
           WHERE id = $1 AND state IN ('queued', 'running') RETURNING id`,
          [id, finishedMs],
        )
        if (changed.length === 0) throw notRunning(id)
        await transaction.query('INSERT INTO replay_sheets (replay_id, sheet) VALUES ($1, $2)', [id, sheet])
      })
    },
    fail: (id, problem, finishedMs = clock()) => end(id, 'failed', finishedMs, problem),
    cancel: (id, finishedMs = clock()) => end(id, 'cancelled', finishedMs),
    async get(id) {
      if (!isId(id)) return undefined
      const rows = await driver.query(
        `SELECT ${COLUMNS}, s.sheet FROM replays r LEFT JOIN replay_sheets s ON s.replay_id = r.id WHERE r.id = $1`,
        [id],
      )
      return rows[0] && toReplay(rows[0])
    },
    async list({ after, limit, sheets = true }) {
      if (!(Number.isInteger(limit) && limit >= 1 && limit <= 1000)) {
        throw new InputError('BAD_REQUEST', `limit: expected a whole number from 1 to 1000, got ${limit}`)
      }
      const cursor = after === undefined ? undefined : readCursor(after)
      const rows = await driver.query(
        `SELECT ${COLUMNS}, ${sheets ? 's.sheet' : 'NULL AS sheet'} FROM replays r
         ${sheets ? 'LEFT JOIN replay_sheets s ON s.replay_id = r.id' : ''}
         ${cursor ? 'WHERE r.created_ms < $2 OR (r.created_ms = $2 AND r.id < $3)' : ''}
         ORDER BY r.created_ms DESC NULLS LAST, r.id DESC NULLS LAST LIMIT $1`,
        cursor ? [limit + 1, cursor.ms, cursor.id] : [limit + 1],
      )
      const replays = rows.slice(0, limit).map(toReplay)
      const last = replays.at(-1)
      return {
        replays,
        next: last && rows.length > limit ? writeCursor({ ms: last.createdMs, id: last.id }) : null,
      }
    },
    async remove(id) {
      if (!isId(id)) return false
      return driver.write(async (transaction) => {
        await transaction.query('DELETE FROM replay_sheets WHERE replay_id = $1', [id])
        const removed = await transaction.query('DELETE FROM replays WHERE id = $1 RETURNING id', [id])
        return removed.length > 0
      })
    },
  }
}

/** At start nothing can be running: what still says so was cut off with the process that ran it. */
export async function failInterrupted(driver: CatalogueDriver, nowMs: number): Promise<void> {
  await driver.write((transaction) =>
    transaction.query(
      `UPDATE replays SET state = 'failed', finished_ms = $1, problem_code = 'INTERRUPTED',
         problem_detail = 'the service stopped while this replay was running; post it again'
       WHERE state IN ('queued', 'running')`,
      [nowMs],
    ),
  )
}

function toReplay(row: Row): StoredReplay {
  const code = row['problem_code']
  return {
    id: row['id'] as string,
    state: row['state'] as StoredReplay['state'],
    site: (row['site'] ?? null) as string | null,
    createdMs: row['created_ms'] as number,
    finishedMs: (row['finished_ms'] ?? null) as number | null,
    sheet: (row['sheet'] ?? null) as string | null,
    problem: typeof code === 'string' ? { code, detail: row['problem_detail'] as string } : null,
  }
}

function notRunning(id: string): InputError {
  return new InputError('REPLAY_NOT_FOUND', `replay: expected a running one, got "${id.slice(0, 100)}"`)
}
