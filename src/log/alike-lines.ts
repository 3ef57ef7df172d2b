import { isUtf8 } from 'node:buffer'
import { sniffEncoding } from './clean-text.ts'
import type { SourcePlan } from './plan-source.ts'
import { noteRow, trackOf, type PostState, type ScanCounts } from './post-state.ts'
import { instantOf, type TurbineTrack } from './row-clock.ts'
import { MOST_TURBINE_BYTES, type ScanPlan } from './row-scanner.ts'
import { SAFE_DELIMITER } from './split-fields.ts'
import type { ZoneTable } from './zone-table.ts'

const [LF, CR, SPACE, QUOTE, COLON, ZULU] = [10, 13, 32, 34, 0x3a, 0x5a]
const MINUTE_BYTES = '2026-03-01T00:10:'.length

/** How SQL reads the log itself, where its lines are all alike. */
export interface AlikeForm {
  readonly headerLine: number
  readonly fields: number
  readonly lineEnd: '\n' | '\r\n'
  /** Position of the stamp. */
  readonly stamp: number
  /** Bytes of every stamp. */
  readonly stampBytes: number
  readonly zoned: boolean
  /** Wall clock minus UTC, ms, in every row. */
  readonly offsetMs: number
}

/** A line unlike the others: the log is to be read line by line. */
export class NotAlike extends Error {}

/**
 * The form that all lines of a log have if they go on as they begin; null when its beginning rules that out. Stamps must be
 * such as `2026-03-01T00:10:00` with T or a blank, with three decimals or none, with Z or without: SQL reads these as the scan does.
 */
export function alikeForm(plan: SourcePlan, zone: ZoneTable): AlikeForm | null {
  const { dialect, map, scan } = plan
  if (plan.isGzip || map.series || scan.safe || scan.jsonKeys || map.time.kind !== 'stamp' || map.dst >= 0)
    return null
  if (scan.fields < 2 || sniffEncoding(plan.firstBytes).encoding !== 'utf-8') return null
  const stamp = dialect.rows[0]?.[map.time.stamp] ?? ''
  if (!/^\d{4}-\d\d-\d\d[T ]\d\d:\d\d:\d\d(\.\d{3})?Z?$/.test(stamp)) return null
  const ends = Int32Array.from({ length: map.time.stamp + 1 }, () => -1)
  ends[map.time.stamp] = stamp.length
  const wallMs = scan.time.read(Buffer.from(stamp), 0, ends)
  const zoned = stamp.endsWith('Z')
  const offsetMs = zoned ? 0 : wallMs - zone.first(wallMs)
  if (!Number.isInteger(offsetMs)) return null
  const firstEnd = Buffer.from(plan.firstBytes).indexOf(LF)
  if (firstEnd < 0) return null
  return {
    headerLine: scan.headerLine,
    fields: scan.fields,
    lineEnd: plan.firstBytes[firstEnd - 1] === CR ? '\r\n' : '\n',
    stamp: map.time.stamp,
    stampBytes: stamp.length,
    zoned,
    offsetMs,
  }
}

/** Whether the turbines of the beginning come one after the other, so that the rows may be sorted as they are. */
export function beginsSorted({ dialect, scan }: SourcePlan): boolean {
  if (scan.turbine < 0) return true
  const names = dialect.rows.map((row) => Buffer.from(row[scan.turbine] ?? ''))
  return names.every((name, i) => i === 0 || Buffer.compare(names[i - 1]!, name) <= 0)
}

/**
 * Looks at every byte of a log whose lines are taken to be alike, and throws at the first one that is not: same number of fields,
 * no quotes, no control characters, no blank line, UTF-8, a turbine and a time of the one form in every row.
 * What it lets pass means the same to SQL that reads the log itself as to the scan line by line.
 */
export class AlikeScanner implements ScanCounts {
  rows = 0
  unzonedRows = 0
  readonly blankLines = 0
  readonly repairedLines = 0
  readonly repeatedHourRows = 0
  readonly unknownKeys = 0
  readonly emptyCells: Float64Array

  private lines = 0
  private readonly form: AlikeForm
  private readonly plan: ScanPlan
  private readonly post: PostState
  /** 1 = ends a stretch of ordinary bytes. */
  private readonly marks = new Uint8Array(256)
  private readonly delimiter: number
  private readonly ends: Int32Array
  /** No text holds 0xff. */
  private readonly minute = new Uint8Array(MINUTE_BYTES - 1).fill(0xff)
  private minuteMs = NaN
  private readonly secondsEnd: number
  private turbineBytes = Buffer.alloc(0)
  private turbine: TurbineTrack | null = null

  constructor(form: AlikeForm, plan: ScanPlan, post: PostState) {
    this.form = form
    this.plan = plan
    this.post = post
    this.delimiter = plan.delimiter.charCodeAt(0)
    for (const mark of [this.delimiter, LF, CR, QUOTE, 0, SAFE_DELIMITER.charCodeAt(0)]) this.marks[mark] = 1
    this.ends = new Int32Array(plan.fields + 1)
    this.emptyCells = new Float64Array(plan.fields)
    this.secondsEnd = form.stampBytes - (form.zoned ? 1 : 0)
    if (plan.turbine < 0) this.turbine = this.trackOf(plan.turbineName)
  }

  /**
   * @param chunks  bytes of the log, decompressed.
   * @throws NotAlike
   */
  async read(chunks: AsyncIterable<Buffer>): Promise<void> {
    const { maxLineBytes } = this.plan.limits
    let rest: Buffer = Buffer.alloc(0)
    for await (const chunk of chunks) {
      const last = chunk.lastIndexOf(LF)
      if (last < 0) rest = Buffer.concat([rest, chunk])
      else {
        const whole = chunk.subarray(0, last + 1)
        this.scan(rest.length > 0 ? Buffer.concat([rest, whole]) : whole)
        // Copied: the chunk is given back to the stream while the rest waits.
        rest = Buffer.from(chunk.subarray(last + 1))
      }
      if (!(rest.length <= maxLineBytes)) throw new NotAlike()
    }
    if (rest.length > 0) this.scan(Buffer.concat([rest, Buffer.from(this.form.lineEnd)]))
  }

  private scan(bytes: Buffer): void {
    if (!isUtf8(bytes)) throw new NotAlike()
    let at = 0
    while (at < bytes.length && this.lines < this.form.headerLine) {
      at = bytes.indexOf(LF, at) + 1
      this.lines++
    }
    this.rowsOf(bytes, at)
    if (!(this.post.rows <= this.plan.limits.maxRows)) throw new NotAlike()
  }

  /** One loop without calls in its usual course: it sees every byte of every large log. */
  private rowsOf(bytes: Buffer, first: number): void {
    const { marks, delimiter, emptyCells, minute, secondsEnd } = this
    const { stamp, stampBytes, zoned, lineEnd } = this.form
    const { maxLineBytes } = this.plan.limits
    const turbineField = this.plan.turbine
    const last = this.form.fields - 1
    const isPlain = secondsEnd === MINUTE_BYTES + 2
    const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.length)
    const length = bytes.length
    const known = new DataView(minute.buffer)
    let [a, b, c, d] = [known.getInt32(0), known.getInt32(4), known.getInt32(8), known.getInt32(12)]
    let minuteMs = this.minuteMs
    let at = first
    while (at < length) {
      const start = at
      let wallMs = NaN
      for (let field = 0; field <= last; field++) {
        const from = at
        if (field === stamp) {
          if (from + stampBytes >= length) throw new NotAlike()
          // Rows of a minute share all but their seconds.
          if (
            view.getInt32(from) !== a ||
            view.getInt32(from + 4) !== b ||
            view.getInt32(from + 8) !== c ||
            view.getInt32(from + 12) !== d ||
            bytes[from + 16] !== COLON
          ) {
            minuteMs = this.newMinute(bytes, from)
            a = known.getInt32(0)
            b = known.getInt32(4)
            c = known.getInt32(8)
            d = known.getInt32(12)
          }
          const tens = bytes[from + MINUTE_BYTES]! - 48
          const ones = bytes[from + MINUTE_BYTES + 1]! - 48
          if (!(tens >= 0 && tens <= 5 && ones >= 0 && ones <= 9)) throw new NotAlike()
          wallMs = minuteMs + tens * 10_000 + ones * 1000
          if (!isPlain) wallMs += decimals(bytes, from + MINUTE_BYTES + 2)
          if (zoned && bytes[from + secondsEnd] !== ZULU) throw new NotAlike()
          at = from + stampBytes
        } else if (field === turbineField) {
          at = this.turbineEnd(bytes, from)
        } else {
          // The last byte is a line end, which is a mark.
          while (marks[bytes[at]!] === 0) at++
          if (at === from) emptyCells[field]!++
        }
        if (field < last) {
          if (bytes[at] !== delimiter) throw new NotAlike()
          at++
        }
      }
      if (lineEnd === '\r\n' && bytes[at++] !== CR) throw new NotAlike()
      if (bytes[at] !== LF || at - start > maxLineBytes) throw new NotAlike()
      this.row(wallMs)
      at++
    }
  }

  private row(wallMs: number): void {
    const { form, plan, post } = this
    const turbine = this.turbine!
    let timeMs = wallMs
    if (!form.zoned) {
      timeMs = instantOf(wallMs, plan.zone, turbine)
      if (timeMs !== wallMs - form.offsetMs || !Number.isNaN(plan.zone.second(wallMs))) throw new NotAlike()
      this.unzonedRows++
    }
    noteRow(post, turbine, timeMs)
    this.rows++
  }

  /** Epoch ms of the minute that a stamp states; its first 16 bytes are noted. */
  private newMinute(bytes: Buffer, from: number): number {
    const { form, ends, minute } = this
    const text = bytes.toString('latin1', from, from + MINUTE_BYTES)
    // The end of a day as 24:00 is left to the scan line by line.
    if (!/^\d{4}-\d\d-\d\d[T ]([01]\d|2[0-3]):[0-5]\d:$/.test(text)) throw new NotAlike()
    const stamp = Buffer.from(`${text}00Z`)
    ends[form.stamp] = stamp.length
    if (form.stamp > 0) ends[form.stamp - 1] = -1
    this.minuteMs = this.plan.time.read(stamp, 0, ends)
    if (Number.isNaN(this.minuteMs)) throw new NotAlike()
    minute.set(bytes.subarray(from, from + minute.length))
    return this.minuteMs
  }

  /** Answers where the field ends. */
  private turbineEnd(bytes: Buffer, from: number): number {
    const { marks, turbineBytes } = this
    const length = turbineBytes.length
    let same = 0
    while (same < length && bytes[from + same] === turbineBytes[same]) same++
    if (same === length && length > 0 && marks[bytes[from + length] ?? 0] === 1) return from + length
    let to = from
    while (marks[bytes[to]!] === 0) to++
    let first = from
    let end = to
    while (first < end && bytes[first] === SPACE) first++
    while (end > first && bytes[end - 1] === SPACE) end--
    const name = bytes.toString('utf8', first, end)
    // eslint-disable-next-line no-control-regex
    if (first === end || end - first > MOST_TURBINE_BYTES || /[\u0000-\u001f/]/.test(name))
      throw new NotAlike()
    this.turbineBytes = Buffer.from(bytes.subarray(from, to))
    this.turbine = this.trackOf(name)
    return to
  }

  private trackOf(name: string): TurbineTrack {
    const found = trackOf(this.post, name)
    if (!found) throw new NotAlike()
    return found
  }
}

/** Milliseconds from a point and three digits. */
function decimals(bytes: Buffer, from: number): number {
  let ms = 0
  if (bytes[from] !== 0x2e) throw new NotAlike()
  for (let i = from + 1; i <= from + 3; i++) {
    const digit = bytes[i]! - 48
    if (!(digit >= 0 && digit <= 9)) throw new NotAlike()
    ms = ms * 10 + digit
  }
  return ms
}
