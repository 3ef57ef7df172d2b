import type { FileHandle } from 'node:fs/promises'
import { InputError } from '../errors.ts'
import { validUtf8 } from './clean-text.ts'
import type { LogLimits } from './contract.ts'
import { MOST_TURBINES, noteRow, trackOf, type PostState, type ScanCounts } from './post-state.ts'
import type { RejectReason } from './rejects.ts'
import { instantOf, isSummer, type TurbineTrack } from './row-clock.ts'
import { fieldText, type RowTime } from './row-time.ts'
import { SAFE_DELIMITER, splitFields } from './split-fields.ts'
import { jsonFields } from './json-line.ts'
import { lineTooLong, type LinePosition } from './text-lines.ts'
import type { ZoneTable } from './zone-table.ts'

const [LF, SPACE, QUOTE] = [10, 32, 34]
export const MOST_TURBINE_BYTES = 100
const [ORDINARY, DELIMITER, LINE_END, QUOTES, CONTROL] = [0, 1, 2, 3, 4]

/** Rows of the log that need the delimiter inside a field: the pass is made again with the safe delimiter. */
export class NeedsSafeDelimiter extends Error {}

export interface ScanPlan {
  readonly name: string
  readonly delimiter: string
  /** Keys of the objects when every line is one; null for delimited lines. */
  readonly jsonKeys: ReadonlyMap<string, number> | null
  readonly fields: number
  /** Positions of the fields that are written on, ascending. */
  readonly kept: readonly number[]
  readonly headerLine: number
  readonly safe: boolean
  readonly time: RowTime
  /** Position of the turbine's name, -1 = `turbineName` for all rows. */
  readonly turbine: number
  readonly turbineName: string
  /** Position of the column that tells whether the clock shows summer time; -1 = none. */
  readonly dst: number
  /** The position above holds the name of a signal: marks that a turbine's name must not have are allowed. */
  readonly isTag: boolean
  readonly zone: ZoneTable
  readonly limits: LogLimits
}

/**
 * Reads lines and writes clean ones: line number, epoch ms, then those fields that
 * are read on, as sent, with a delimiter that no field contains.
 * Lines that are no row are counted or rejected with their reason. Works on bytes: this loop sees every byte of every log.
 */
export class RowScanner implements LinePosition, ScanCounts {
  /** Lines seen, header and preamble included. */
  lines = 0
  blankLines = 0
  /** Rows passed on. */
  rows = 0
  repairedLines = 0
  unzonedRows = 0
  repeatedHourRows = 0
  /** Keys of JSON objects that the beginning of the log did not show. */
  unknownKeys = 0
  /** Empty cells per field among rows passed on. */
  readonly emptyCells: Float64Array
  readonly outDelimiter: string

  private readonly plan: ScanPlan
  private readonly post: PostState
  private readonly kinds = new Uint8Array(256)
  private readonly ends: Int32Array
  private readonly kept: Int32Array
  /** First and last field of stretches that are copied in one piece. */
  private readonly runs: Int32Array
  private readonly outByte: number
  private readonly inByte: number
  private out = Buffer.allocUnsafe(2 * 1024 ** 2)
  private used = 0
  private lastTurbine = Buffer.alloc(0)
  private lastTrack: TurbineTrack | null = null

  constructor(plan: ScanPlan, post: PostState) {
    this.plan = plan
    this.post = post
    this.inByte = plan.delimiter.charCodeAt(0)
    this.outDelimiter = plan.safe ? SAFE_DELIMITER : plan.delimiter
    this.outByte = this.outDelimiter.charCodeAt(0)
    this.ends = new Int32Array(plan.fields + 1)
    this.kept = Int32Array.from(plan.kept)
    this.runs = Int32Array.from(runsOf(plan.kept, this.inByte === this.outByte))
    this.emptyCells = new Float64Array(plan.fields)
    this.kinds[this.inByte] = DELIMITER
    this.kinds[LF] = LINE_END
    this.kinds[QUOTE] = QUOTES
    this.kinds[0] = CONTROL
    this.kinds[SAFE_DELIMITER.charCodeAt(0)] = CONTROL
    if (plan.turbine < 0) this.lastTrack = this.trackOf(plan.turbineName)
  }

  /**
   * @param slab  whole lines, each ended by LF.
   * @throws InputError LOG_LINE_TOO_LONG, LOG_TOO_MANY_ROWS, LOG_COLUMN_MAP; NeedsSafeDelimiter
   */
  async write(slab: Buffer, file: FileHandle): Promise<void> {
    const { bytes, repairedLines } = validUtf8(slab)
    this.repairedLines += repairedLines
    this.scan(bytes)
    await file.write(this.out, 0, this.used)
    this.used = 0
    await this.post.rejects.flush()
  }

  private scan(bytes: Buffer): void {
    const { kinds, ends, plan } = this
    const fields = plan.fields
    const length = bytes.length
    let start = 0
    let n = 0
    let quotes = false
    let control = false
    for (let i = 0; i < length; i++) {
      const kind = kinds[bytes[i]!]!
      if (kind === ORDINARY) continue
      if (kind === DELIMITER) {
        if (n < fields) ends[n] = i
        n++
      } else if (kind === LINE_END) {
        if (n < fields) ends[n] = i
        this.lines++
        if (i - start > plan.limits.maxLineBytes)
          throw lineTooLong(plan.name, this.lines, plan.limits.maxLineBytes)
        if (this.lines > plan.headerLine) this.line(bytes, start, i, n + 1, quotes, control)
        start = i + 1
        n = 0
        quotes = false
        control = false
      } else if (kind === QUOTES) quotes = true
      else control = true
    }
  }

  private line(
    bytes: Buffer,
    start: number,
    end: number,
    n: number,
    quotes: boolean,
    control: boolean,
  ): void {
    if (n === 1 && isBlank(bytes, start, end)) {
      this.blankLines++
      return
    }
    if (control) this.reject(bytes, start, end, 'not-text')
    else if (this.plan.jsonKeys) this.jsonLine(bytes, start, end, this.plan.jsonKeys)
    else if (quotes) this.quotedLine(bytes, start, end)
    else if (n !== this.plan.fields) this.reject(bytes, start, end, 'field-count')
    else this.row(bytes, start, end, bytes, start, end)
  }

  /** A line with quotes is taken apart as text and written anew; these lines are slower by an order of magnitude. */
  private quotedLine(bytes: Buffer, start: number, end: number): void {
    const fields = splitFields(bytes.toString('utf8', start, end), this.plan.delimiter)
    if (!fields) {
      this.reject(bytes, start, end, 'quote')
      return
    }
    if (fields.length !== this.plan.fields) {
      this.reject(bytes, start, end, 'field-count')
      return
    }
    if (!this.plan.safe && fields.some((field) => field.includes(this.outDelimiter)))
      throw new NeedsSafeDelimiter()
    this.rewritten(fields, bytes, start, end)
  }

  private jsonLine(bytes: Buffer, start: number, end: number, keys: ReadonlyMap<string, number>): void {
    const object = jsonFields(bytes.toString('utf8', start, end), keys)
    if (!object) {
      this.reject(bytes, start, end, 'json')
      return
    }
    this.unknownKeys += object.unknown
    this.rewritten(object.fields, bytes, start, end)
  }

  private rewritten(fields: readonly string[], bytes: Buffer, start: number, end: number): void {
    const clean = Buffer.from(fields.join(this.outDelimiter))
    let at = -1
    fields.forEach((field, i) => {
      at += Buffer.byteLength(field) + 1
      this.ends[i] = at
    })
    this.row(clean, 0, clean.length, bytes, start, end)
  }

  private row(
    bytes: Buffer,
    start: number,
    end: number,
    sent: Buffer,
    sentStart: number,
    sentEnd: number,
  ): void {
    const { ends, plan } = this
    const turbine = plan.turbine < 0 ? this.lastTrack : this.turbineOf(bytes, start)
    if (typeof turbine === 'string') {
      this.reject(sent, sentStart, sentEnd, turbine)
      return
    }
    const wallMs = plan.time.read(bytes, start, ends)
    let timeMs = wallMs
    if (!plan.time.zoned && !Number.isNaN(wallMs)) {
      const summer = plan.dst < 0 ? null : isSummer(fieldText(bytes, start, ends, plan.dst))
      timeMs = instantOf(wallMs, plan.zone, turbine!, summer)
      this.unzonedRows++
      if (summer === null && !Number.isNaN(plan.zone.second(wallMs))) this.repeatedHourRows++
    }
    if (Number.isNaN(timeMs)) {
      const reason = !Number.isNaN(wallMs)
        ? 'spring-gap'
        : plan.time.isBlank(bytes, start, ends)
          ? 'no-time'
          : 'bad-time'
      this.reject(sent, sentStart, sentEnd, reason)
      return
    }
    this.note(turbine!, timeMs)
    this.emit(bytes, start, end, timeMs)
  }

  private note(turbine: TurbineTrack, timeMs: number): void {
    const { post } = this
    noteRow(post, turbine, timeMs)
    this.rows++
    if (post.rows > this.plan.limits.maxRows) {
      throw new InputError(
        'LOG_TOO_MANY_ROWS',
        `${this.plan.name} line ${this.lines}: expected at most ${this.plan.limits.maxRows} rows, got more`,
      )
    }
  }

  private turbineOf(bytes: Buffer, start: number): TurbineTrack | RejectReason {
    const { turbine } = this.plan
    let from = turbine === 0 ? start : this.ends[turbine - 1]! + 1
    let to = this.ends[turbine]!
    while (from < to && bytes[from] === SPACE) from++
    while (to > from && bytes[to - 1] === SPACE) to--
    if (this.lastTrack && same(this.lastTurbine, bytes, from, to)) return this.lastTrack
    if (from === to) return 'no-turbine'
    if (to - from > MOST_TURBINE_BYTES) return 'bad-turbine'
    const name = bytes.toString('utf8', from, to)
    // Such names could not be addressed over HTTP.
    // eslint-disable-next-line no-control-regex
    if (!this.plan.isTag && /[\u0000-\u001f/]/.test(name)) return 'bad-turbine'
    this.lastTurbine = Buffer.from(bytes.subarray(from, to))
    return (this.lastTrack = this.trackOf(name))
  }

  private trackOf(name: string): TurbineTrack {
    const found = trackOf(this.post, name)
    if (!found) {
      throw new InputError(
        'LOG_COLUMN_MAP',
        `${this.plan.name} line ${this.lines}: expected at most ${MOST_TURBINES} turbines, got more; is the column of turbines the right one?`,
      )
    }
    return found
  }

  private emit(bytes: Buffer, start: number, end: number, timeMs: number): void {
    const { ends, kept, runs, emptyCells, outByte } = this
    const most = end - start + 64
    if (this.used + most > this.out.length) {
      const grown = Buffer.allocUnsafe(Math.max(this.out.length * 2, this.used + most))
      this.out.copy(grown, 0, 0, this.used)
      this.out = grown
    }
    const out = this.out
    let at = writeDigits(out, this.used, this.lines)
    out[at++] = outByte
    at = writeTime(out, at, timeMs)
    for (let k = 0; k < runs.length; k += 2) {
      const first = runs[k]!
      const from = first === 0 ? start : ends[first - 1]! + 1
      const to = ends[runs[k + 1]!]!
      out[at++] = outByte
      if (to - from > 64) at += bytes.copy(out, at, from, to)
      else for (let i = from; i < to; i++) out[at++] = bytes[i]!
    }
    for (let k = 0; k < kept.length; k++) {
      const field = kept[k]!
      if (ends[field] === (field === 0 ? start : ends[field - 1]! + 1)) emptyCells[field]!++
    }
    out[at++] = LF
    this.used = at
  }

  private reject(bytes: Buffer, start: number, end: number, reason: RejectReason): void {
    this.post.rejects.add(this.plan.name, this.lines, reason, bytes.toString('utf8', start, end))
  }
}

/** Fields side by side are copied together, unless the delimiter between them changes. */
function runsOf(kept: readonly number[], together: boolean): number[] {
  const runs: number[] = []
  for (const field of kept) {
    if (together && runs.length > 0 && runs.at(-1) === field - 1) runs[runs.length - 1] = field
    else runs.push(field, field)
  }
  return runs
}

function isBlank(bytes: Buffer, start: number, end: number): boolean {
  for (let i = start; i < end; i++)
    if (bytes[i] !== SPACE && bytes[i] !== 9 && bytes[i] !== 0x1a) return false
  return true
}

function same(known: Buffer, bytes: Buffer, from: number, to: number): boolean {
  const length = to - from
  if (known.length !== length) return false
  for (let i = 0; i < length; i++) if (known[i] !== bytes[from + i]) return false
  return length > 0
}

/** Digits of a whole number >= 0 below 2^31; answers the position after them. */
function writeDigits(out: Buffer, at: number, value: number): number {
  let digits = 1
  for (let power = 10; digits < 10 && value >= power; power *= 10) digits++
  let rest = value
  for (let i = at + digits - 1; i >= at; i--) {
    const next = (rest / 10) | 0
    out[i] = 48 + rest - next * 10
    rest = next
  }
  return at + digits
}

/** Epoch milliseconds in decimal. */
function writeTime(out: Buffer, at: number, timeMs: number): number {
  if (!(timeMs >= 1e12 && timeMs < 1e13)) return at + out.write(String(timeMs), at, 'latin1')
  // Thirteen digits in two halves, because whole-number division of the engine ends at 2^31.
  const high = Math.floor(timeMs / 1e6)
  let low = timeMs - high * 1e6
  for (let i = at + 12; i >= at + 7; i--) {
    const next = (low / 10) | 0
    out[i] = 48 + low - next * 10
    low = next
  }
  writeDigits(out, at, high)
  return at + 13
}
