import { byWorth } from './by-worth.ts'
import type { ScoreSheet } from './score-sheet.ts'
import type { SiteFile } from './site-file.ts'
import type { Unsettled, VisitValue, WorklistEntry } from './worklist.ts'

const LINE_WIDTH = 100
const INSET = '   '
const KIND_TEXT: Readonly<Record<WorklistEntry['kind'], string>> = {
  offset: '',
  sensor: 'a sensor, and no number to enter',
  shared: 'off alike: one measurement, no climbs yet',
}

/** What of a sheet a work order is written from. */
export interface WorkOrderSource {
  readonly replay: string
  readonly site: string | null
  readonly window: ScoreSheet['window']
  readonly worklist: readonly WorklistEntry[]
  /** Turbines of the site that were not scored or came to no verdict, with the reason: not on the list is not the same as aligned. */
  readonly unsettled: readonly Unsettled[]
}

/** Turbines of a sheet without a verdict, those with most at stake first, and turbines of the site file that the sheet does not hold. */
export function unsettledTurbines(sheet: ScoreSheet, site: SiteFile): Unsettled[] {
  const held = new Set(sheet.turbines.map(({ turbine }) => turbine))
  return [
    ...sheet.turbines
      .filter(({ verdict }) => verdict === 'undetermined' || verdict === 'blocked')
      .map(({ turbine, verdict, reason, outlook }) => ({
        turbine,
        reason: `${verdict}: ${reason}`,
        probabilityBeyondThreshold: outlook?.probabilityBeyondThreshold ?? null,
        expectedAnnualMwh: outlook?.expectedAnnualMwh ?? null,
      }))
      .sort((a, b) => (b.expectedAnnualMwh ?? -1) - (a.expectedAnnualMwh ?? -1)),
    ...(site.turbines ?? [])
      .filter(({ turbine }) => !held.has(turbine))
      .map(({ turbine }) => ({
        turbine,
        reason: 'not in this replay: no rows in its window, or not asked for',
        probabilityBeyondThreshold: null,
        expectedAnnualMwh: null,
      })),
  ]
}

/**
 * The worklist as plain text for a work order, for somebody who was not there: where to go, what to turn which way, what to check
 * before and watch after, fields to fill in, and every caution once.
 */
export function workOrder(source: WorkOrderSource): string {
  const { worklist } = source
  const cautions = [...new Set(worklist.flatMap((one) => one.cautions))]
  const lines = [
    `Worklist of ${source.site ?? 'a log without a site file'}, ${minute(source.window.from)} to ${minute(source.window.to)} UTC (replay ${source.replay})`,
    '',
    ...(worklist.length === 0 ? ['No turbine was found to stand off the wind.', ''] : signLines()),
    ...worklist.flatMap((one, index) => [...entryLines(one, index + 1, source.site), '']),
    ...(source.unsettled.length === 0
      ? []
      : [
          'Without a verdict, and so neither on the list nor aligned; most at stake first:',
          ...source.unsettled.flatMap((one) => wrapped(unsettledText(one), '- ')),
          '',
        ]),
    ...(cautions.length === 0
      ? []
      : ['Cautions - read them before anybody is sent:', ...cautions.flatMap((one) => wrapped(one, '- '))]),
  ]
  return `${lines.join('\n').trimEnd()}\n`
}

/**
 * Work orders of several sites: who comes first over all of them, then the order of each.
 *
 * @param unscored  sites without a worklist, and why.
 */
export function fleetOrder(
  orders: readonly WorkOrderSource[],
  unscored: readonly { readonly site: string; readonly reason: string }[] = [],
): string {
  return [fleetRanking(orders, unscored), ...orders.map(workOrder)].join('\n')
}

/** Who comes first over several sites, a line each: what to do there, and every caution, stand in the order of the site. */
export function fleetRanking(
  orders: readonly WorkOrderSource[],
  unscored: readonly { readonly site: string; readonly reason: string }[] = [],
): string {
  const ranked = rankedOverSites(orders)
  const lines = [
    `Who to visit first over ${orders.length} ${orders.length === 1 ? 'site' : 'sites'}, by what a visit is expected to bring; what to do there, and the cautions, stand in the order of each site`,
    '',
    ...(ranked.length === 0 ? ['No turbine was found to stand off the wind.'] : []),
    ...ranked.flatMap(({ site, entry }, index) => {
      const kind = KIND_TEXT[entry.kind]
      const what =
        entry.kind === 'sensor' ? entry.why : `${degrees(entry.standingMisalignmentDeg)}; ${gainText(entry)}`
      const net = entry.value?.firstYearNet ?? null
      const money = isKnown(net) ? `; first year net ${whole(net)} ${entry.value?.currency ?? ''}` : ''
      return wrapped(
        `${site ?? 'a log without a site file'}, ${entry.turbine}${kind === '' ? '' : ` (${kind})`}: ${what}${money}`,
        `${index + 1}. `,
      )
    }),
    ...(unscored.length === 0
      ? []
      : [
          '',
          'Sites without a list:',
          ...unscored.flatMap((one) => wrapped(`${one.site}: ${one.reason}`, '- ')),
        ]),
  ]
  return `${lines.join('\n')}\n`
}

/** Entries of several sites in one order. */
export function rankedOverSites<T extends Pick<WorkOrderSource, 'site' | 'worklist'>>(
  orders: readonly T[],
): { site: string | null; order: T; entry: WorklistEntry }[] {
  return orders
    .flatMap((order) => order.worklist.map((entry) => ({ site: order.site, order, entry })))
    .sort((a, b) => sensorLast(a.entry) - sensorLast(b.entry) || byWorth(a.entry, b.entry))
}

function sensorLast({ kind }: WorklistEntry): number {
  return kind === 'sensor' ? 1 : 0
}

/** What a signed number of the list means; printed above every list. */
function signLines(): string[] {
  return [
    ...wrapped(
      'Signs: all angles are degrees seen from above, clockwise positive. A misalignment of +5 means that the nacelle must stand 5 degrees further clockwise to face the wind. Recommendations from operating data; nothing has been changed by this program.',
      '',
    ),
    '',
  ]
}

function entryLines(one: WorklistEntry, rank: number, site: string | null): string[] {
  const kind = KIND_TEXT[one.kind]
  return [
    `${rank}. ${one.turbine}${kind === '' ? '' : ` (${kind})`}`,
    ...(one.kind === 'sensor'
      ? []
      : wrapped(`misalignment m: ${withInterval(one)}; ${gainText(one)}`, INSET)),
    ...(one.value === null ? [] : wrapped(valueText(one.value), INSET)),
    ...(site === null ? [] : wrapped(`where: ${site}, turbine ${one.turbines.join(', ')}`, INSET)),
    ...wrapped(`to do: ${one.whatToDo}`, INSET),
    ...(one.parameter === null
      ? []
      : wrapped(
          `parameter ${one.parameter.name}: now ${degrees(one.parameter.currentDeg)} by the site file, ${degrees(one.parameter.afterFirstStepDeg)} after the first step, ${degrees(one.parameter.newDeg)} in the end`,
          INSET,
        )),
    ...wrapped(`why: ${one.why}`, INSET),
    ...list(one.reasons, '- '),
    ...section('before a climb, at the desk:', one.deskChecks, '[ ] '),
    ...section(
      'on the same visit, look after:',
      one.findings.map(
        ({ sensor, howSure, finding, from, to }) =>
          `${sensor} (${howSure}, ${minute(from)} to ${minute(to)}): ${finding}`,
      ),
      '[ ] ',
    ),
    ...section('afterwards:', one.watchAfter, '[ ] '),
    ...section('what would make it surer:', one.firmUp, '- '),
    ...(one.kind === 'shared'
      ? []
      : [
          `${INSET}vane offset as found: __________ degrees    as left: __________ degrees`,
          `${INSET}date and time: ____________________    by: ____________________`,
          `${INSET}note: ______________________________________________________________`,
        ]),
  ]
}

function withInterval(one: WorklistEntry): string {
  const [lower = null, upper = null] = one.standingInterval95Deg
  const interval = lower === null || upper === null ? '' : ` (95 %: ${signed(lower)} to ${signed(upper)})`
  return `${degrees(one.standingMisalignmentDeg)}${interval}`
}

function gainText({ expectedAnnualMwh, interval95Mwh }: WorklistEntry): string {
  const [lower = null, upper = null] = interval95Mwh
  if (!isKnown(expectedAnnualMwh)) return 'gain of a year: not known'
  const interval = isKnown(lower) && isKnown(upper) ? ` [${whole(lower)}, ${whole(upper)}]` : ''
  return `gain of a year: ${whole(expectedAnnualMwh)} MWh${interval}`
}

function valueText(value: VisitValue): string {
  const { currency } = value
  const sum = (amount: number | null): string =>
    isKnown(amount) ? `${whole(amount)} ${currency}` : 'not known'
  const [low = null, high = null] = value.annualInterval95
  const annual = `worth of a year: ${sum(value.annual)}${isKnown(low) && isKnown(high) ? ` [${whole(low)}, ${whole(high)}]` : ''} at ${(value.pricePerMwh ?? NaN).toFixed(2)} a MWh`
  if (!isKnown(value.visitCost)) return annual
  const [netLow = null, netHigh = null] = value.firstYearNetInterval95
  const [soon = null, late = null] = value.paybackInterval95Months
  return (
    `${annual}; a visit costs ${sum(value.visitCost)}, so that the first year brings ${sum(value.firstYearNet)} net` +
    (isKnown(netLow) && isKnown(netHigh) ? ` [${whole(netLow)}, ${whole(netHigh)}]` : '') +
    `; paid back ${isKnown(value.paybackMonths) ? `in ${months(value.paybackMonths)}` : 'never'} [${months(soon)}, ${months(late)}]` +
    (isKnown(value.firstYearNet) && value.firstYearNet < 0
      ? '. It does not pay a visit of its own within a year: do it on the next visit'
      : '')
  )
}

function unsettledText({
  turbine,
  reason,
  probabilityBeyondThreshold,
  expectedAnnualMwh,
}: Unsettled): string {
  const stake =
    isKnown(expectedAnnualMwh) && isKnown(probabilityBeyondThreshold)
      ? `; at stake ${whole(expectedAnnualMwh)} MWh a year, off by more than the threshold with a probability of ${Math.round(100 * probabilityBeyondThreshold)} %`
      : ''
  return `${turbine}: ${reason}${stake}`
}

function section(title: string, lines: readonly string[], mark: string): string[] {
  return lines.length === 0 ? [] : [`${INSET}${title}`, ...list(lines, mark)]
}

function list(lines: readonly string[], mark: string): string[] {
  return lines.flatMap((line) => wrapped(line, `${INSET}${INSET}${mark}`))
}

function isKnown(value: number | null): value is number {
  return value !== null && Number.isFinite(value)
}

function months(value: number | null): string {
  return isKnown(value) ? `${value < 10 ? value.toFixed(1) : value.toFixed(0)} months` : 'never'
}

function whole(value: number): string {
  return value.toFixed(0).replace(/^-0$/, '0')
}

function signed(value: number): string {
  return `${value < 0 ? '' : '+'}${value.toFixed(1)}`
}

function degrees(value: number | null): string {
  if (!isKnown(value)) return 'not known'
  return `${value > 0 ? '+' : ''}${value.toFixed(1)} degrees`
}

/** Words in lines, the first with a mark before it and the others as far in. */
function wrapped(text: string, mark: string): string[] {
  const lines: string[] = []
  let line = ''
  for (const word of text.split(' ')) {
    if (line !== '' && mark.length + line.length + 1 + word.length > LINE_WIDTH) {
      lines.push(line)
      line = word
    } else {
      line = line === '' ? word : `${line} ${word}`
    }
  }
  lines.push(line)
  return lines.map((one, index) => (index === 0 ? mark : ' '.repeat(mark.length)) + one)
}

function minute(iso: string | null): string {
  return iso === null ? '?' : iso.slice(0, 16).replace('T', ' ')
}
