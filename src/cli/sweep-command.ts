import { DateTime } from 'luxon'
import { InputError } from '../errors.ts'
import type { ScoreSheet, SiteFile } from '../sheet/index.ts'
import { fleetRanking, unsettledTurbines, workOrder, type WorkOrderSource } from '../sheet/work-order.ts'
import { correctionLines, isAlarm } from '../sheet/correction-lines.ts'
import { newsLines } from '../sheet/news-lines.ts'
import type { Archive, CommandParts, SettingFlags } from './parts.ts'
import { progressLine } from './progress-line.ts'
import { report } from './report.ts'

export interface SweepFlags {
  site?: string[]
  all?: boolean
  month?: string
  from?: string
  to?: string
}

const NOTHING_TO_DO = 0
const FAILED = 1
const SOMEONE_SHOULD_CLIMB = 10
const SITES_A_PAGE = 200

/**
 * Scores the stored logs of whole sites, one after the other, and prints the worklist of each; after them, of several sites,
 * who comes first over all. A site that fails is said on standard error and does not stop the others.
 *
 * @returns exit status: 1 when a site failed, else 10 when a worklist holds somebody or a correction went wrong, else 0.
 */
export async function sweepCommand(
  flags: SweepFlags,
  settings: SettingFlags,
  parts: CommandParts,
): Promise<number> {
  checkFlags(flags)
  const archive = await parts.openArchive(settings)
  const progress = progressLine(parts.stderr)
  let failed = false
  let climbs = false
  const orders: WorkOrderSource[] = []
  try {
    for (const site of flags.site ?? (await allSites(archive))) {
      try {
        const file = await archive.setup.getSite(site)
        const sheet: ScoreSheet = await archive.replays.stored(
          { site, ...windowOf(flags, file), settings: archive.settings },
          progress.show,
        )
        progress.clear()
        const { replay, window, worklist } = sheet
        const unsettled = unsettledTurbines(sheet, file)
        const order = { replay, site, window, worklist, unsettled }
        parts.stdout.write(listText(`Corrections at ${site}:`, correctionLines(sheet.corrections)))
        parts.stdout.write(`${workOrder(order)}\n`)
        orders.push({ ...order, unsettled: [] })
        parts.stdout.write(await newsText(archive, sheet))
        climbs ||= worklist.length > 0 || sheet.corrections.some(isAlarm)
      } catch (error) {
        progress.clear()
        failed = true
        parts.stderr.write(`site ${site}: `)
        report(error, parts.stderr)
      }
    }
  } finally {
    await archive.close()
  }
  if (orders.length > 1) parts.stdout.write(fleetRanking(orders))
  if (failed) return FAILED
  return climbs ? SOMEONE_SHOULD_CLIMB : NOTHING_TO_DO
}

/** What the sheet says that the one before it did not. */
async function newsText({ replays }: Archive, sheet: ScoreSheet): Promise<string> {
  const news = await replays.news(sheet.replay)
  if (!news || news.since === null) return ''
  const lines = newsLines(news)
  const title = `New at ${sheet.site ?? 'the site'} since replay ${news.since}:`
  return lines.length === 0 ? `${title} nothing\n\n` : listText(title, lines)
}

function listText(title: string, lines: readonly string[]): string {
  return lines.length === 0 ? '' : `${title}\n${lines.map((line) => `- ${line}`).join('\n')}\n\n`
}

function checkFlags({ site, all, month, from, to }: SweepFlags): void {
  if ((site === undefined) === (all !== true)) {
    const got = site === undefined ? 'neither' : 'both'
    throw new InputError('BAD_OPTION', `--site, --all: expected one of them, got ${got}`)
  }
  if (month === undefined ? from === undefined || to === undefined : from !== undefined || to !== undefined) {
    throw new InputError('BAD_OPTION', '--month, --from, --to: expected --month, or --from and --to')
  }
  if (month !== undefined && !/^\d{4}-(0[1-9]|1[0-2])$/.test(month)) {
    throw new InputError('BAD_OPTION', `--month: expected a month such as 2026-03, got "${month}"`)
  }
  for (const [flag, text] of [
    ['--from', from],
    ['--to', to],
  ] as const) {
    if (text !== undefined) momentMs(text, 'utc', flag)
  }
}

/** @throws InputError BAD_OPTION */
function windowOf({ month, from, to }: SweepFlags, { timezone = 'utc' }: SiteFile) {
  if (month === undefined) {
    return { fromMs: momentMs(from ?? '', timezone, '--from'), toMs: momentMs(to ?? '', timezone, '--to') }
  }
  const first = DateTime.fromISO(`${month}-01`, { zone: timezone })
  return { fromMs: first.toMillis(), toMs: first.plus({ months: 1 }).toMillis() }
}

function momentMs(text: string, zone: string, flag: string): number {
  const moment = DateTime.fromISO(text, { zone })
  if (moment.isValid) return moment.toMillis()
  throw new InputError(
    'BAD_OPTION',
    `${flag}: expected a date or a time such as 2026-03-01T00:00:00Z, got "${text}"`,
  )
}

async function allSites({ setup }: Archive): Promise<string[]> {
  const found: string[] = []
  let after: string | undefined
  do {
    const page = await setup.listSites({ limit: SITES_A_PAGE, ...(after === undefined ? {} : { after }) })
    found.push(...page.sites)
    after = page.next ?? undefined
  } while (after !== undefined)
  return found
}
