import type { SensorFinding, SensorTest } from '../../sheet/index.ts'

/** What tests of sensors found, and which of them the log allowed. */
export interface SensorReport {
  readonly findings: readonly SensorFinding[]
  readonly tests: readonly SensorTest[]
}

export function joinReports(reports: readonly SensorReport[]): SensorReport {
  return {
    findings: reports.flatMap(({ findings }) => findings),
    tests: reports.flatMap(({ tests }) => tests),
  }
}

/** A report of one test. */
export function tested(
  sensor: SensorTest['sensor'],
  test: string,
  note: string,
  findings: readonly SensorFinding[] = [],
): SensorReport {
  return { findings, tests: [{ sensor, test, done: true, note }] }
}

/** A test that the log does not allow, and what is missing. */
export function notTested(sensor: SensorTest['sensor'], test: string, note: string): SensorReport {
  return { findings: [], tests: [{ sensor, test, done: false, note }] }
}
