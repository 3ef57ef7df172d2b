import type { ScoreSheet, WorklistEntry } from './score-sheet.ts'
import type { SiteFile } from './site-file.ts'

const LINE_WIDTH = 100

/** What of a sheet a work order is written from. */
export interface WorkOrderSource {
  readonly replay: string
  readonly site: string | null
  readonly window: ScoreSheet['window']
  readonly worklist: readonly WorklistEntry[]
  /** Turbines of the site that were not scored or came to no verdict, with the reason: not on the list is not the same as aligned. */
  readonly unsettled: readonly { readonly turbine: string; readonly reason: string }[]
}

/** Turbines of a sheet without a verdict, and turbines of the site file that the sheet does not hold. */
export function unsettledTurbines(sheet: ScoreSheet, site: SiteFile): WorkOrderSource['unsettled'] {
  const held = new Set(sheet.turbines.map(({ turbine }) => turbine))
  return [
    ...sheet.turbines
      .filter(({ verdict }) => verdict === 'undetermined' || verdict === 'blocked')
      .map(({ turbine, verdict, reason }) => ({ turbine, reason: `${verdict}: ${reason}` })),
    ...(site.turbines ?? [])
      .filter(({ turbine }) => !held.has(turbine))
      .map(({ turbine }) => ({
        turbine,
        reason: 'not in this replay: no rows in its window, or not asked for',
      })),
  ]
}

/**
 * The worklist as plain text for a work order: who first, why, what to look at before a climb, and every caution once.
 */
export function workOrder(source: WorkOrderSource): string {
  const { worklist } = source
  const cautions = [...new Set(worklist.flatMap((one) => one.cautions))]
  const lines = [
    `Worklist of ${source.site ?? 'a log without a site file'}, ${minute(source.window.from)} to ${minute(source.window.to)} UTC (replay ${source.replay})`,
    '',
    ...(worklist.length === 0 ? ['No turbine was found to stand off the wind.', ''] : []),
    ...worklist.flatMap((one, index) => [...entryLines(one, index + 1), '']),
    ...(source.unsettled.length === 0
      ? []
      : [
          'Without a verdict, and so neither on the list nor aligned:',
          ...source.unsettled.flatMap(({ turbine, reason }) => wrapped(`${turbine}: ${reason}`, '- ')),
          '',
        ]),
    ...(cautions.length === 0 ? [] : ['Cautions:', ...cautions.flatMap((one) => wrapped(one, '- '))]),
  ]
  return `${lines.join('\n').trimEnd()}\n`
}

function entryLines(one: WorklistEntry, rank: number): string[] {
  const [lower = null, upper = null] = one.interval95Mwh
  const gain =
    one.expectedAnnualMwh === null
      ? 'gain of a year: not known'
      : `gain of a year: ${one.expectedAnnualMwh.toFixed(0)} MWh${lower === null || upper === null ? '' : ` [${lower.toFixed(0)}, ${upper.toFixed(0)}]`}`
  return [
    `${rank}. ${one.turbine}`,
    ...wrapped(`misalignment m: ${degrees(one.standingMisalignmentDeg)}; ${gain}`, '   '),
    ...wrapped(
      one.addToVaneDeg === null
        ? 'to enter: no number yet, as the sign or the kind of vane is not settled'
        : `to enter after confirmation: add ${degrees(one.addToVaneDeg)} to the vane offset of the controller`,
      '   ',
    ),
    ...wrapped(`why: ${one.why}`, '   '),
    ...wrapped(`check first: ${one.checkFirst}`, '   '),
  ]
}

function degrees(value: number | null): string {
  if (value === null || !Number.isFinite(value)) return 'not known'
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
