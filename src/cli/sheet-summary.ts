import Table from 'cli-table3'
import { CAUTION_IN_SHORT, CAUTIONS } from '../replay/index.ts'
import { correctionLines } from '../sheet/correction-lines.ts'
import type { ScoreSheet, TurbineSheet } from '../sheet/index.ts'

/** Widths without the gap between columns; with it a line takes 118 characters. */
const WIDTHS = { turbine: 11, verdict: 14, standing: 21, loss: 8, annual: 20, advice: 44 } as const

const LONGEST_CAUTION = 115
const LINE_WIDTH = 116

/**
 * A score sheet as a person reads it in a terminal: plain text, at most 120 characters a line.
 *
 * @param paths  where the files of the sheet lie.
 */
export function sheetSummary(sheet: ScoreSheet, paths: readonly string[]): string {
  const lines = [
    `${sheet.site ?? 'log without a site file'}, ${day(sheet.window.from)} to ${day(sheet.window.to)}`,
    ...correctionSection(sheet),
    '',
    turbineTable(sheet),
    '',
    'm: degrees that the nacelle must stand further clockwise, seen from above; it is added to the vane reading.',
    ...exponentLines(sheet),
    '',
    rowsLine(sheet),
    ...findingSection(sheet.turbines),
    ...section('Warnings', warningsOf(sheet)),
    ...section('Cautions', cautionLines(sheet.turbines)),
    '',
    ...visitLines(sheet),
    ...paths.map((path) => `written: ${path}`),
  ]
  return `${lines.join('\n')}\n`
}

/** Who to visit first, and with it every caution: the list may be all that somebody reads. */
function visitLines({ worklist }: ScoreSheet): string[] {
  if (worklist.length === 0) return [...wrapped(CAUTION_IN_SHORT), '']
  const lines = worklist.map((one, rank) => {
    const gain = withInterval(one.expectedAnnualMwh, one.interval95Mwh, whole)
    const net = one.value?.firstYearNet ?? null
    const money =
      one.value !== null && net !== null && Number.isFinite(net)
        ? `, ${whole(net)} ${one.value.currency} net in the first year`
        : ''
    const what = one.kind === 'sensor' ? one.why : `${gain} MWh a year expected${money}`
    return `${rank + 1}. ${one.turbine}: ${what}`
  })
  return [
    'Who to visit first, by what it is expected to bring (the largest estimates drawn in):',
    ...lines.flatMap(indented),
    '',
    'Cautions, to be read before anybody is sent:',
    ...CAUTIONS.flatMap((one) => indented(`- ${one}`)),
    '',
  ]
}

function indented(text: string): string[] {
  return wrapped(text).map((line, k) => (k > 0 ? `  ${line}` : line))
}

/** Why an interval reaches further away from 0 than towards it. */
function exponentLines({ provenance: { settings }, turbines }: ScoreSheet): string[] {
  const widest = Math.max(...turbines.map((one) => one.staticOffset.intervalParts.exponent ?? 0))
  if (!(widest >= 0.05)) return []
  const { exponent, exponentLow, exponentHigh } = settings
  return wrapped(
    `Power shows exponent times m: read at ${exponent}, intervals hold what exponents of ${exponentLow} to ${exponentHigh} would make ` +
      'of it. Where the exponent is known, state it as exponentLow and exponentHigh.',
  )
}

/** What is wrong with sensors, drives and controllers, in full; what is only information stands in the sheet. */
function findingSection(turbines: readonly TurbineSheet[]): string[] {
  const lines = turbines.flatMap(({ turbine, sensors }) =>
    sensors
      .filter(({ severity }) => severity !== 'info')
      .map(({ severity, finding }) => `- ${turbine} (${severity}): ${finding}`),
  )
  if (lines.length === 0) return []
  return ['', 'Sensors, drives, controllers:', ...lines.flatMap(hanging)]
}

function hanging(text: string): string[] {
  return wrapped(text).map((line, k) => (k > 0 ? `  ${line}` : line))
}

/** In full and before everything else: somebody may have to go back today. */
function correctionSection({ corrections }: ScoreSheet): string[] {
  if (corrections.length === 0) return []
  return ['', 'Corrections:', ...correctionLines(corrections).flatMap((text) => hanging(`- ${text}`))]
}

/** Those of corrections stand above the table already. */
function warningsOf({ warnings, receipt, corrections }: ScoreSheet): string[] {
  const told = new Set(correctionLines(corrections))
  return unique([...warnings, ...receipt.warnings]).filter((warning) => !told.has(warning))
}

function turbineTable(sheet: ScoreSheet): string {
  const table = new Table({
    head: ['turbine', 'verdict', 'm, degrees [95 %]', 'loss, %', 'MWh a year [95 %]', 'what to do'],
    colWidths: Object.values(WIDTHS),
    wordWrap: true,
    wrapOnWordBoundary: true,
    style: { head: [], border: [], 'padding-left': 0, 'padding-right': 1 },
    chars: {
      top: '',
      'top-mid': '',
      'top-left': '',
      'top-right': '',
      bottom: '',
      'bottom-mid': '',
      'bottom-left': '',
      'bottom-right': '',
      left: '',
      'left-mid': '',
      mid: '',
      'mid-mid': '',
      right: '',
      'right-mid': '',
      middle: '',
    },
  })
  for (const one of sheet.turbines) {
    const { staticOffset, energyLoss } = one
    const judged = one.verdict === 'offset' || one.verdict === 'aligned'
    table.push([
      one.turbine,
      one.verdict,
      withInterval(staticOffset.standingMisalignmentDeg, staticOffset.standingInterval95Deg, signed),
      judged ? plain(energyLoss.static.recoverablePctOfProduced, 2) : '?',
      // What is not settled is no loss to plan with: how large it may be is all that can be said.
      judged
        ? withInterval(energyLoss.static.annualMwh, energyLoss.static.annualInterval95Mwh, whole)
        : intervalAlone(energyLoss.static.annualInterval95Mwh, whole),
      one.advice[0] ?? one.reason,
    ])
  }
  return table
    .toString()
    .split('\n')
    .map((line) => line.trimEnd())
    .join('\n')
}

function withInterval(
  value: number | null,
  interval: readonly (number | null)[],
  format: (value: number | null) => string,
): string {
  const [lower = null, upper = null] = interval
  if (lower === null || upper === null) return format(value)
  return `${format(value)} [${format(lower)}, ${format(upper)}]`
}

function intervalAlone(
  [lower = null, upper = null]: readonly (number | null)[],
  format: (value: number | null) => string,
): string {
  return lower === null || upper === null ? '?' : `[${format(lower)}, ${format(upper)}]`
}

function whole(value: number | null): string {
  return plain(value, 0)
}

function signed(value: number | null): string {
  if (value === null || !Number.isFinite(value)) return '?'
  const text = plain(value, 1)
  return value > 0 && text !== '0.0' ? `+${text}` : text
}

function plain(value: number | null, decimals: number): string {
  if (value === null || !Number.isFinite(value)) return '?'
  const text = value.toFixed(decimals)
  return Number(text) === 0 ? text.replace('-', '') : text
}

function rowsLine(sheet: ScoreSheet): string {
  const { received, accepted, duplicate, rejected } = sheet.rows
  const used = sheet.turbines.reduce((sum, one) => sum + one.rows.used, 0)
  return `rows: ${received} received = ${accepted} accepted + ${duplicate} duplicate + ${rejected} rejected; ${used} used for the offsets`
}

/** One line a caution, with the turbines that it is said of. */
function cautionLines(turbines: readonly TurbineSheet[]): string[] {
  const byText = new Map<string, string[]>()
  for (const one of turbines) {
    const own = one.cautions.filter((caution) => !CAUTIONS.includes(caution))
    for (const caution of own) byText.set(caution, [...(byText.get(caution) ?? []), one.turbine])
  }
  return [...byText].map(([text, names]) => {
    const who =
      names.length === turbines.length
        ? 'all'
        : names.length > 4
          ? `${names.length} turbines`
          : names.join(', ')
    return `${who}: ${text}`
  })
}

function section(title: string, lines: readonly string[]): string[] {
  if (lines.length === 0) return []
  return ['', `${title}:`, ...lines.map((line) => `- ${shortened(line)}`)]
}

function wrapped(text: string): string[] {
  const lines: string[] = []
  let line = ''
  for (const word of text.split(' ')) {
    if (line !== '' && line.length + 1 + word.length > LINE_WIDTH) {
      lines.push(line)
      line = word
    } else {
      line = line === '' ? word : `${line} ${word}`
    }
  }
  return [...lines, line]
}

function shortened(text: string): string {
  return text.length > LONGEST_CAUTION ? `${text.slice(0, LONGEST_CAUTION - 3)}...` : text
}

function unique(lines: readonly string[]): string[] {
  return [...new Set(lines)]
}

function day(iso: string | null): string {
  return iso === null ? '?' : iso.slice(0, 16).replace('T', ' ')
}
