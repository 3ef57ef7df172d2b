import type { Receipt } from '../sheet/index.ts'
import type { TurbineCount } from '../store/index.ts'

/**
 * The account of a window of stored logs, from those of the logs it draws on.
 *
 * `accepted`: rows of the window that count. `duplicate`: rows of the window that a later log overruled, and those that were
 * overruled inside the logs. `rejected`: of the logs in whole, since a rejected row has no dependable time. `received`:
 * their sum. Counts of cells, blank lines and inputs are those of the logs in whole.
 *
 * @param receipts  earliest log first; at least one
 * @param counted  rows that count, per turbine
 */
export function windowReceipt(
  receipts: readonly Receipt[],
  counted: readonly TurbineCount[],
  overruled: number,
): Receipt {
  const accepted = sum(counted, ({ rows }) => rows)
  const duplicate = sum(receipts, (receipt) => receipt.duplicate) + overruled
  const rejected = sum(receipts, (receipt) => receipt.rejected)
  const warnings = [...new Set(receipts.flatMap((receipt) => receipt.warnings))]
  if (duplicate > 0 || rejected > 0) {
    warnings.push(
      `rows: accepted are those of the window; ${duplicate} duplicate ones are ${overruled} of the window that a later log overruled and ${duplicate - overruled} inside the ${receipts.length} logs it draws on; ${rejected} rejected ones are of these logs in whole`,
    )
  }
  return {
    received: accepted + duplicate + rejected,
    accepted,
    duplicate,
    rejected,
    rejectedByReason: rejectedByReason(receipts),
    blankLines: sum(receipts, (receipt) => receipt.blankLines),
    first: iso(Math.min(...counted.map(({ firstMs }) => firstMs))),
    last: iso(Math.max(...counted.map(({ lastMs }) => lastMs))),
    intervalS: commonestInterval(receipts),
    turbines: counted.map(({ turbine, rows }) => ({ turbine, rows })),
    columns: columnsOf(receipts),
    inputs: receipts.flatMap(({ inputs }) => inputs),
    warnings,
  }
}

/** Line and text of the first log that has the reason. */
function rejectedByReason(receipts: readonly Receipt[]): Receipt['rejectedByReason'] {
  const byReason = new Map<string, Receipt['rejectedByReason'][number]>()
  for (const entry of receipts.flatMap((receipt) => receipt.rejectedByReason)) {
    const known = byReason.get(entry.reason)
    byReason.set(entry.reason, known ? { ...known, rows: known.rows + entry.rows } : entry)
  }
  return [...byReason.values()]
}

function columnsOf(receipts: readonly Receipt[]): Receipt['columns'] {
  const byKey = new Map<string, Receipt['columns'][number]>()
  for (const entry of receipts.flatMap(({ columns }) => columns)) {
    const key = JSON.stringify([entry.column, entry.takenFor, entry.unit])
    const known = byKey.get(key)
    byKey.set(
      key,
      known
        ? {
            ...known,
            unreadable: known.unreadable + entry.unreadable,
            outOfRange: known.outOfRange + entry.outOfRange,
            missing: known.missing + entry.missing,
          }
        : entry,
    )
  }
  return [...byKey.values()]
}

/** By rows; of equal ones the shorter. */
function commonestInterval(receipts: readonly Receipt[]): number | null {
  const rows = new Map<number, number>()
  for (const { intervalS, accepted } of receipts) {
    if (intervalS !== null) rows.set(intervalS, (rows.get(intervalS) ?? 0) + accepted)
  }
  const sorted = [...rows].sort(([a, n], [b, m]) => m - n || a - b)
  return sorted[0]?.[0] ?? null
}

function sum<T>(items: readonly T[], of: (item: T) => number): number {
  return items.reduce((total, item) => total + of(item), 0)
}

function iso(ms: number): string {
  return new Date(ms).toISOString()
}
