import type { Attribution } from '../../sheet/index.ts'
import { OTHER_RULES } from './attribution-others.ts'
import { VANE_RULES } from './attribution-vane.ts'
import { said, type AttributedSheet, type Explanation } from './explanation.ts'
import { offSameWay } from './same-way.ts'

/**
 * Weighs what was found at each turbine of a farm: what the findings point to together, on what evidence, and which
 * check would settle it. One paragraph a turbine; desk checks come before climbs.
 *
 * @param turbines  sheets of the whole farm: a fault that all turbines of a model share is not the vane of one.
 * @param thresholdDeg  the misalignment that calls for action
 * @returns one entry for each turbine, in order
 */
export function attributions(turbines: readonly AttributedSheet[], thresholdDeg: number): Attribution[] {
  const together = offSameWay(turbines, thresholdDeg)
  return turbines.map((sheet) => {
    const sameWay = together.get(sheet.model) ?? null
    const seen = [...VANE_RULES, ...OTHER_RULES]
      .flatMap((rule) => rule({ sheet, sameWay }) ?? [])
      .sort((a, b) => b.weight - a.weight)
    return joined(sheet, [...unique(seen), ...leftOver(sheet, seen)])
  })
}

function joined(sheet: AttributedSheet, seen: readonly Explanation[]): Attribution {
  if (seen.length === 0) return { text: nothingFound(sheet), evidence: [], wouldSettle: [] }
  const work = sheet.sensors.some(({ severity }) => severity !== 'info') || sheet.verdict === 'offset'
  const checks = [...new Set(seen.flatMap(({ wouldSettle }) => wouldSettle))]
  const atDesk = checks.filter(desk)
  return {
    text: [...(work ? [] : [nothingFound(sheet)]), ...seen.map(({ text }) => text)].join(' '),
    evidence: [...new Set(seen.flatMap(({ evidence }) => evidence))],
    wouldSettle: [...atDesk, ...checks.filter((check) => !desk(check))],
  }
}

function nothingFound({ verdict, reason }: AttributedSheet): string {
  if (verdict === 'aligned')
    return 'No sensor and no drive shows a fault, and the turbine stands to the wind.'
  return `No sensor and no drive shows a fault. Whether the turbine stands off the wind is open: ${reason}.`
}

/** An explanation whose findings another one accounts for already says nothing new. */
function unique(seen: readonly Explanation[]): Explanation[] {
  return seen.filter(
    ({ findings }, i) =>
      findings.length === 0 ||
      findings.some((finding) => !seen.slice(0, i).some((earlier) => earlier.findings.includes(finding))),
  )
}

/** Findings that no rule takes up are told as they are. */
function leftOver(sheet: AttributedSheet, seen: readonly Explanation[]): Explanation[] {
  const rest = sheet.sensors.filter(
    (finding) => finding.severity !== 'info' && !seen.some(({ findings }) => findings.includes(finding)),
  )
  if (rest.length === 0) return []
  return [
    {
      weight: 0,
      text: `Besides: ${rest.map(({ finding }) => finding).join('; ')}.`,
      evidence: rest.map(said),
      wouldSettle: rest.map(({ checkFirst }) => checkFirst),
      findings: rest,
    },
  ]
}

function desk(check: string): boolean {
  return check.startsWith('At the desk')
}
