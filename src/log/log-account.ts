import { InputError } from '../errors.ts'
import type { Receipt } from '../sheet/index.ts'
import type { LogReading } from './contract.ts'
import { limitsOf } from './clean-file.ts'
import type { SourcePlan } from './plan-source.ts'
import type { PostState, ScanCounts } from './post-state.ts'
import type { CellCount, StagedRows } from './stage-rows.ts'

/** What the scan of one source left behind. */
export interface SourceAccount {
  readonly plan: SourcePlan
  readonly scanner: ScanCounts
  readonly sha256: string
  readonly rejectedInScan: number
  /** Rows passed on: lines, or what was made of them. */
  rows: number
}

/** @throws InputError LOG_NO_ROWS, LOG_TIME when the scan has left no row to work with */
export function refuseUnfit(accounts: readonly SourceAccount[], post: PostState): void {
  const bad = post.rejects.count('bad-time')
  if (bad && bad.rows > post.rows) {
    const time = accounts.map(({ plan }) => plan.timeFormat)[0] ?? ''
    throw new InputError(
      'LOG_TIME',
      `line ${bad.firstLine}: expected times as ${time}; ${bad.rows} of ${bad.rows + post.rows} rows cannot be read so, the first is: ${bad.firstText}`,
    )
  }
  if (post.rows > 0) return
  const reasons = post.rejects
    .counts()
    .map(({ reason, rows, firstLine }) => `${reason} ${rows} (first: line ${firstLine ?? 0})`)
  throw new InputError(
    'LOG_NO_ROWS',
    `expected rows below the header, got ${reasons.length === 0 ? 'none' : `only rejected ones: ${reasons.join(', ')}`}`,
  )
}

/**
 * Puts the account together, and refuses what it shows to be unfit.
 * @throws InputError LOG_COLUMN_UNREADABLE, LOG_UNIT, LOG_NO_ROWS
 */
export function buildReceipt(parts: {
  accounts: readonly SourceAccount[]
  post: PostState
  staged: StagedRows
  /** Per source: counts by channel; empty when nothing was lost. */
  cells: readonly ReadonlyMap<string, CellCount>[]
  overall: number | null
  reading: LogReading
  warnings: string[]
  channels: readonly string[]
}): Receipt {
  const { accounts, post, staged, cells, warnings } = parts
  accounts.forEach((account, i) => {
    refuseColumns(account, cells[i]!)
  })
  if (staged.accepted === 0) {
    const first = post.rejects.count('no-values')
    throw new InputError(
      'LOG_NO_ROWS',
      `expected values in some column, got none in any of ${post.rows} rows; the first is line ${first?.firstLine ?? 0}: ${first?.firstText ?? ''}`,
    )
  }
  const received = accounts.reduce((sum, { rows, rejectedInScan }) => sum + rows + rejectedInScan, 0)
  const rejected = post.rejects.rows
  if (received !== staged.accepted + staged.duplicate + rejected) {
    throw new Error(
      `rows: ${received} received, ${staged.accepted} + ${staged.duplicate} + ${rejected} accounted for`,
    )
  }
  addWarnings(parts)
  const first = Math.min(...staged.turbines.map(({ firstMs }) => firstMs))
  const last = Math.max(...staged.turbines.map(({ lastMs }) => lastMs))
  return {
    received,
    accepted: staged.accepted,
    duplicate: staged.duplicate,
    rejected,
    rejectedByReason: post.rejects.counts(),
    blankLines: accounts.reduce((sum, { scanner }) => sum + scanner.blankLines, 0),
    first: new Date(first).toISOString(),
    last: new Date(last).toISOString(),
    intervalS: parts.overall === null ? null : parts.overall / 1000,
    turbines: staged.turbines.map(({ turbine, rows }) => ({ turbine, rows })),
    columns: columnAccounts(accounts, cells, staged),
    inputs: accounts.map(({ plan, rows, sha256, rejectedInScan }) => ({
      name: plan.source.name,
      sha256,
      rows: rows + rejectedInScan,
    })),
    warnings,
  }
}

function refuseColumns({ plan }: SourceAccount, cells: ReadonlyMap<string, CellCount>): void {
  for (const column of plan.map.channels) {
    const count = cells.get(column.takenFor!)
    if (!count) continue
    if (count.unreadable * 2 > count.filled) {
      throw new InputError(
        'LOG_COLUMN_UNREADABLE',
        `${plan.source.name} column ${column.name}: taken for ${column.takenFor!}, expected numbers` +
          `${plan.dialect.decimalComma ? ' with decimal comma' : ''}; ${count.unreadable} of ${count.filled} cells are none, ` +
          `the first in line ${count.exampleLine ?? 0}: ${(count.example ?? '').slice(0, 80)}`,
        { detail: { column: column.name, line: count.exampleLine } },
      )
    }
    // Sentinels above the limit are one value or two; a power in watts is a thousand different ones.
    const readable = count.filled - count.unreadable
    if (
      column.takenFor === 'power' &&
      !column.unitStated &&
      count.above * 50 > readable &&
      count.aboveKinds >= 10
    ) {
      throw new InputError(
        'LOG_UNIT',
        `${plan.source.name} column ${column.name}: taken for power in kW, ${count.above} of ${readable} values lie above ${limitsOf('power').max}; ` +
          `if it is in watts, state it: columns={"power":{"column":${JSON.stringify(column.name)},"unit":"W"}}`,
      )
    }
  }
}

function columnAccounts(
  accounts: readonly SourceAccount[],
  cells: readonly ReadonlyMap<string, CellCount>[],
  staged: StagedRows,
): Receipt['columns'] {
  const byKey = new Map<string, Receipt['columns'][number]>()
  accounts.forEach(({ plan }, i) => {
    const counted = new Set<string>()
    for (const column of plan.map.columns) {
      const key = `${column.name}\n${column.takenFor ?? ''}`
      // Of several columns for one channel (one per turbine) the first carries the counts of all.
      const isFirst = column.takenFor !== null && !counted.has(column.takenFor)
      if (isFirst) counted.add(column.takenFor)
      const count = isFirst ? cells[i]!.get(column.takenFor) : undefined
      const entry = byKey.get(key) ?? {
        column: column.name,
        takenFor: column.takenFor,
        unit: column.unitText,
        why: column.why,
        unreadable: 0,
        outOfRange: 0,
        missing: !isFirst ? 0 : staged.accepted - (staged.present.get(column.takenFor) ?? staged.accepted),
      }
      entry.unreadable += count?.unreadable ?? 0
      entry.outOfRange += count?.outOfRange ?? 0
      byKey.set(key, entry)
    }
  })
  return [...byKey.values()]
}

function addWarnings(parts: Parameters<typeof buildReceipt>[0]): void {
  const { accounts, post, reading, warnings, channels } = parts
  const sum = (of: (scanner: ScanCounts) => number) =>
    accounts.reduce((total, { scanner }) => total + of(scanner), 0)
  const unzoned = sum((scanner) => scanner.unzonedRows)
  if (unzoned > 0 && reading.timezone === undefined && reading.defaultTimezone === undefined) {
    warnings.push('time: stamps state no offset and no time zone was given; they are taken as UTC')
  }
  const repeated = sum((scanner) => scanner.repeatedHourRows)
  if (repeated > 0) {
    warnings.push(
      `time: ${repeated} rows lie in the hour that the clock shows twice in autumn; their order tells which is which`,
    )
  }
  const gap = post.rejects.count('spring-gap')
  if (gap) {
    warnings.push(
      `time: ${gap.rows} rows lie in the hour that the clock skips in spring (first: line ${gap.firstLine}); is the time zone the right one?`,
    )
  }
  const repaired = sum((scanner) => scanner.repairedLines)
  if (repaired > 0) warnings.push(`text: ${repaired} lines are no UTF-8 and were read as Windows-1252`)
  const unknownKeys = sum((scanner) => scanner.unknownKeys)
  if (unknownKeys > 0)
    warnings.push(
      `columns: ${unknownKeys} values have keys that the beginning of the log does not show; they are not used`,
    )
  for (const { plan, scanner, rows } of accounts) {
    const { series } = plan.map
    if (series) {
      warnings.push(
        series.shape.kind === 'wide'
          ? `${plan.source.name}: one column per turbine and signal; every line makes ${series.shape.turbines.length} rows`
          : `${plan.source.name}: one value per line; ${scanner.rows} values of ${series.shape.tags.length} known signals make ${rows} rows`,
      )
      continue
    }
    if (plan.scan.turbine >= 0) continue
    const origin = reading.turbine === undefined ? 'the file name' : 'the request'
    warnings.push(
      `${plan.source.name}: no column of turbines; all rows belong to ${plan.scan.turbineName}, named by ${origin}`,
    )
  }
  for (const channel of ['vane', 'wind_speed', 'power']) {
    if (!channels.includes(channel)) warnings.push(`columns: no column was taken for ${channel}`)
  }
}
