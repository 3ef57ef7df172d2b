import { table } from 'arquero'
import type { ScoreSheet } from '../sheet/index.ts'

type Cell = string | number | boolean | null

/** The tables of a sheet for a spreadsheet: file name -> CSV. What is not known is an empty field. */
export function csvTables(sheet: ScoreSheet): Record<string, string> {
  const turbines = sheet.turbines.map((one) => ({
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
  const worklist = sheet.worklist.map((one, index) => ({
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
  }))
  const setAside = sheet.turbines.flatMap((one) =>
    one.rows.setAside.map(({ reason, rows }) => ({ turbine: one.turbine, reason, rows })),
  )
  return {
    'turbines.csv': csv(turbines, ['turbine']),
    'worklist.csv': csv(worklist, ['rank', 'turbine']),
    'set-aside.csv': csv(setAside, ['turbine', 'reason', 'rows']),
  }
}

/** @param columns  the header of a table without a row. */
function csv(rows: readonly Record<string, Cell>[], columns: readonly string[]): string {
  const [first] = rows
  if (first === undefined) return `${columns.join(',')}\n`
  const names = Object.keys(first)
  const known = (cell: Cell | undefined) => (cell === undefined || Number.isNaN(cell) ? null : cell)
  const cells = Object.fromEntries(names.map((name) => [name, rows.map((row) => known(row[name]))]))
  return table(cells, names).toCSV()
}
