import type { ScoreSheet } from '../sheet/index.ts'
import { setAsideRows, toCsv, turbineRows, worklistRows } from '../sheet/tables.ts'

/** The tables of a sheet for a spreadsheet: file name -> CSV. What is not known is an empty field. */
export function csvTables(sheet: ScoreSheet): Record<string, string> {
  return {
    'turbines.csv': toCsv(turbineRows(sheet.turbines), ['turbine']),
    'worklist.csv': toCsv(worklistRows(sheet.worklist), ['rank', 'turbine']),
    'set-aside.csv': toCsv(setAsideRows(sheet), ['turbine', 'reason', 'rows']),
  }
}
