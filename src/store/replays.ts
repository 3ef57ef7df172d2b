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
  /** Notes a replay as running, or as waiting for its turn. Epoch milliseconds, whole. */
  begin(replay: {
    id: string
    site: string | null
    createdMs: number
    state?: 'queued' | 'running'
  }): Promise<void>
  /** Its turn has come. @throws InputError REPLAY_NOT_FOUND when it does not wait (any more) */
  run(id: string): Promise<void>
  /**
   * Keeps the sheet and the state `done` together. Resolves when they are on disk.
   * @param request  what the sheet was made with beside the rows, as JSON; read by `request`, removed with the replay.
   * @throws InputError REPLAY_NOT_FOUND when it is not running (any more), STORAGE_FULL
   */
  finish(id: string, sheet: string, finishedMs: number, request?: string): Promise<void>
  /** What `finish` was given as request; undefined when there is none. */
  request(id: string): Promise<string | undefined>
  /** @throws InputError REPLAY_NOT_FOUND when it is not running (any more) */
  fail(id: string, problem: { code: string; detail: string }, finishedMs?: number): Promise<void>
  /** @throws InputError REPLAY_NOT_FOUND when it is not running (any more) */
  cancel(id: string, finishedMs?: number): Promise<void>
  get(id: string): Promise<StoredReplay | undefined>
  /**
   * Newest first. `next` is the cursor of the following page, null on the last one.
   * @param page.limit  1 to 1000
   * @param page.site  only replays of this site
   * @param page.state  only replays in this state
   * @param page.sheets  false leaves `sheet` null, for lists that do not show it; default true
   * @throws InputError BAD_REQUEST for a cursor of another origin
   */
  list(page: {
    after?: string
    limit: number
    sheets?: boolean
    site?: string
    state?: StoredReplay['state']
  }): Promise<{ replays: StoredReplay[]; next: string | null }>
  /** How many replays there are in each state that has any. */
  counts(): Promise<Partial<Record<StoredReplay['state'], number>>>
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
    async begin({ id, site, createdMs, state = 'running' }) {
      checkId(id)
      await driver.write((transaction) =>
        transaction.query(`INSERT INTO replays (id, state, site, created_ms) VALUES ($1, $2, $3, $4)`, [
          id,
          state,
          site,
          createdMs,
        ]),
      )
    },
    async run(id) {
      await driver.write(async (transaction) => {
        const changed = await transaction.query(
          `UPDATE replays SET state = 'running' WHERE id = $1 AND state = 'queued' RETURNING id`,
          [id],
        )
        if (changed.length === 0) throw notRunning(id)
      })
    },
    async finish(id, sheet, finishedMs, request) {
      await driver.write(async (transaction) => {
        const changed = await transaction.query(
          `UPDATE replays SET state = 'done', finished_ms = $2
           WHERE id = $1 AND state IN ('queued', 'running') RETURNING id`,
          [id, finishedMs],
        )
        if (changed.length === 0) throw notRunning(id)
        await transaction.query('INSERT INTO replay_sheets (replay_id, sheet) VALUES ($1, $2)', [id, sheet])
        if (request === undefined) return
        await transaction.query('INSERT INTO replay_requests (replay_id, request) VALUES ($1, $2)', [
          id,
          request,
        ])
      })
    },
    async request(id) {
      if (!isId(id)) return undefined
      const rows = await driver.query('SELECT request FROM replay_requests WHERE replay_id = $1', [id])
      return rows[0]?.['request'] as string | undefined
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
    async list({ after, limit, sheets = true, site, state }) {
      if (!(Number.isInteger(limit) && limit >= 1 && limit <= 1000)) {
        throw new InputError('BAD_REQUEST', `limit: expected a whole number from 1 to 1000, got ${limit}`)
      }
      const cursor = after === undefined ? undefined : readCursor(after)
      const values: (string | number)[] = [limit + 1]
      const bind = (value: string | number) => `$${values.push(value)}`
      const conditions: string[] = []
      if (cursor) {
        const ms = bind(cursor.ms)
        conditions.push(`(r.created_ms < ${ms} OR (r.created_ms = ${ms} AND r.id < ${bind(cursor.id)}))`)
      }
      if (site !== undefined) conditions.push(`r.site = ${bind(site)}`)
      if (state !== undefined) conditions.push(`r.state = ${bind(state)}`)
      const rows = await driver.query(
        `SELECT ${COLUMNS}, ${sheets ? 's.sheet' : 'NULL AS sheet'} FROM replays r
         ${sheets ? 'LEFT JOIN replay_sheets s ON s.replay_id = r.id' : ''}
         ${conditions.length > 0 ? `WHERE ${conditions.join(' AND ')}` : ''}
         ORDER BY r.created_ms DESC NULLS LAST, r.id DESC NULLS LAST LIMIT $1`,
        values,
      )
      const replays = rows.slice(0, limit).map(toReplay)
      const last = replays.at(-1)
      return {
        replays,
        next: last && rows.length > limit ? writeCursor({ ms: last.createdMs, id: last.id }) : null,
      }
    },
    async counts() {
      const rows = await driver.query('SELECT state, count(*) AS replays FROM replays GROUP BY state')
      return Object.fromEntries(rows.map((row) => [row['state'] as string, Number(row['replays'])]))
    },
    async remove(id) {
      if (!isId(id)) return false
      return driver.write(async (transaction) => {
        await transaction.query('DELETE FROM replay_sheets WHERE replay_id = $1', [id])
        await transaction.query('DELETE FROM replay_requests WHERE replay_id = $1', [id])
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
