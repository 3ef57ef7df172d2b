import type { LogDescription } from '../intake/index.ts'

/** How a log would be read, as a person reads it: what each column was taken for, and what stands in the way. */
export function descriptionText(log: LogDescription): string {
  const { problem, firstRows } = log
  const known = (value: string | number | boolean | null) => (value === null ? '?' : String(value))
  const lines = [
    log.name,
    `  encoding ${log.encoding}, form ${known(log.form)}, delimiter ${JSON.stringify(log.delimiter)}, decimal comma ${known(log.decimalComma)}, header in line ${known(log.headerLine)}`,
    `  time ${known(log.timeFormat)}, zone ${log.timezone}, stamps mark the ${log.stamp} of ${known(log.intervalS)} s`,
    '  columns:',
    ...log.columns.map(({ column, takenFor, unit, why }) =>
      takenFor === null
        ? `    ${column}: not used (${why})`
        : `    ${column}: ${takenFor}${unit === null ? '' : ` in ${unit}`} (${why})`,
    ),
    ...list('missing, and wanted by the scoring', log.missing),
    ...list(
      'rows rejected at the beginning',
      log.rejectedByReason.map(({ reason, rows }) => `${reason}: ${rows}`),
    ),
    ...list(
      'first rows',
      firstRows.map((row) => JSON.stringify(row)),
    ),
    ...list('warnings', log.warnings),
    ...(problem === null ? [] : [`  it would be refused: ${problem.code}: ${problem.message}`]),
  ]
  return `${lines.join('\n')}\n`
}

function list(title: string, lines: readonly string[]): string[] {
  return lines.length === 0 ? [] : [`  ${title}:`, ...lines.map((line) => `    ${line}`)]
}
