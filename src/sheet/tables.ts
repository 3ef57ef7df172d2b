import { table } from 'arquero'
import type { ScoreSheet, TurbineSheet } from './score-sheet.ts'
import type { WorklistEntry } from './worklist.ts'

// Not listed in index.ts: whoever wants the shapes alone shall not load a table library, and worker threads least of all.

export type Cell = string | number | boolean | null
export type TableRow = Readonly<Record<string, Cell>>

/**
 * Rows as CSV with a header. What is not known is an empty field.
 * @param columns  header of a table without a row; otherwise the names of the first row count.
 */
export function toCsv(rows: readonly TableRow[], columns: readonly string[]): string {
  const [first] = rows
  if (first === undefined) return `${columns.join(',')}\n`
  const names = Object.keys(first)
  const known = (cell: Cell | undefined) => (cell === undefined || Number.isNaN(cell) ? null : cell)
  const cells = Object.fromEntries(names.map((name) => [name, rows.map((row) => known(row[name]))]))
  return table(cells, names).toCSV()
}

/** One row of a table of the sheet: an interval becomes two columns, anything else with an inside its JSON. */
export function flatRow(row: object): TableRow {
  const cells: [string, Cell][] = []
  for (const [name, value] of Object.entries(row) as [string, unknown][]) {
    if (name.startsWith('interval95') && Array.isArray(value)) {
      const [lower, upper] = value as (number | null)[]
      const unit = name.slice('interval95'.length)
      cells.push([`lower${unit}`, lower ?? null], [`upper${unit}`, upper ?? null])
    } else if (typeof value === 'object' && value !== null) {
      cells.push([name, JSON.stringify(value)])
    } else {
      cells.push([name, (value ?? null) as Cell])
    }
  }
  return Object.fromEntries(cells)
}

/** The worklist, first rank first; the last fields are blank, for whoever makes the change. */
export function worklistRows(worklist: readonly WorklistEntry[]): TableRow[] {
  return worklist.map((one, index) => ({
    rank: index + 1,
    turbine: one.turbine,
    standingMisalignmentDeg: one.standingMisalignmentDeg,
    addToVaneDeg: one.addToVaneDeg,
    expectedAnnualMwh: one.expectedAnnualMwh,
    lowerMwh: one.interval95Mwh[0] ?? null,
    upperMwh: one.interval95Mwh[1] ?? null,
    why: one.why,
    checkFirst: one.checkFirst,
    cautions: one.cautions.join('; '),
    kind: one.kind,
    turbines: one.turbines.join(' '),
    standingLowerDeg: one.standingInterval95Deg[0] ?? null,
    standingUpperDeg: one.standingInterval95Deg[1] ?? null,
    shrunkStandingDeg: one.shrunkStandingDeg,
    probabilityBeyondThreshold: one.probabilityBeyondThreshold,
    firstStepDeg: one.firstStepDeg,
    parameterNowDeg: one.parameter?.currentDeg ?? null,
    parameterNewDeg: one.parameter?.newDeg ?? null,
    currency: one.value?.currency ?? null,
    annualValue: one.value?.annual ?? null,
    visitCost: one.value?.visitCost ?? null,
    firstYearNet: one.value?.firstYearNet ?? null,
    firstYearNetLower: one.value?.firstYearNetInterval95[0] ?? null,
    firstYearNetUpper: one.value?.firstYearNetInterval95[1] ?? null,
    paybackMonths: one.value?.paybackMonths ?? null,
    whatToDo: one.whatToDo,
    reasons: one.reasons.join('; '),
    deskChecks: one.deskChecks.join('; '),
    findings: one.findings.map(({ sensor, finding }) => `${sensor}: ${finding}`).join('; '),
    watchAfter: one.watchAfter.join('; '),
    firmUp: one.firmUp.join('; '),
    asFoundDeg: null,
    asLeftDeg: null,
    changedAt: null,
    by: null,
    note: null,
  }))
}

/** One row a turbine: verdict, misalignment, loss. */
export function turbineRows(turbines: readonly TurbineSheet[]): TableRow[] {
  return turbines.map((one) => ({
    turbine: one.turbine,
    verdict: one.verdict,
    reason: one.reason,
    standingMisalignmentDeg: one.staticOffset.standingMisalignmentDeg,
    standingLowerDeg: one.staticOffset.standingInterval95Deg[0] ?? null,
    standingUpperDeg: one.staticOffset.standingInterval95Deg[1] ?? null,
    staticOffsetDeg: one.staticOffset.estimateDeg,
    score: one.score,
    vaneMeanDeg: one.vane.meanDeg,
    yawErrorCircularSdDeg: one.yawError.circularSdDeg,
    recoverablePctOfProduced: one.energyLoss.static.recoverablePctOfProduced,
    annualMwh: one.energyLoss.static.annualMwh,
    annualLowerMwh: one.energyLoss.static.annualInterval95Mwh[0] ?? null,
    annualUpperMwh: one.energyLoss.static.annualInterval95Mwh[1] ?? null,
    rowsAccepted: one.rows.accepted,
    rowsUsed: one.rows.used,
    signChecked: one.staticOffset.signChecked,
    vaneLogged: one.staticOffset.vaneLogged,
    cautions: one.cautions.join('; '),
  }))
}

/** Rows set aside, by turbine and reason. */
export function setAsideRows(sheet: ScoreSheet): TableRow[] {
  return sheet.turbines.flatMap((one) =>
    one.rows.setAside.map(({ reason, rows }) => ({ turbine: one.turbine, reason, rows })),
  )
}
