import type { WorklistEntry } from './worklist.ts'

/**
 * Order of a list: what the first year is expected to bring net of the visit, where both entries have it in one currency; else
 * energy. An entry without either comes last; names settle what is left.
 */
export function byWorth(a: WorklistEntry, b: WorklistEntry): number {
  const inOneCurrency = a.value !== null && b.value !== null && a.value.currency === b.value.currency
  const worth = (one: WorklistEntry): number | null => one.value?.firstYearNet ?? one.value?.annual ?? null
  const [worthA, worthB] = [worth(a), worth(b)]
  const bySum = inOneCurrency && worthA !== null && worthB !== null ? worthB - worthA : 0
  // NaN, as from a cost that is not known, settles nothing.
  return (
    bySum || (b.expectedAnnualMwh ?? -1) - (a.expectedAnnualMwh ?? -1) || (a.turbine < b.turbine ? -1 : 1)
  )
}
