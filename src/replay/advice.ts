import type { Verdict } from '../analysis/index.ts'
import type { TurbineSheet } from '../sheet/index.ts'

type StaticOffset = TurbineSheet['staticOffset']

/** Whether the sign and the kind of vane are known well enough to print a number that may be entered. */
export function mayEnter(
  offset: Pick<StaticOffset, 'signChecked' | 'vaneLogged'>,
  verdict: TurbineSheet['verdict'],
): boolean {
  return verdict === 'offset' && offset.signChecked && offset.vaneLogged !== 'unknown'
}

/** What to look at before anybody climbs. */
export const DESK_CHECK =
  'Before a climb: read the vane offset parameter, compare it with the record of the last change, and ask for a photograph of the vane’s mark.'

/** What a reader should do next, most important first; the first line stands in tables. */
export function adviceFor(verdict: Verdict, offset: StaticOffset): string[] {
  const standing = offset.standingMisalignmentDeg
  switch (verdict.verdict) {
    case 'offset': {
      if (standing === null) return []
      if (!mayEnter(offset, 'offset')) return [...whatIsMissing(offset, standing), DESK_CHECK]
      const vaneFirst =
        offset.byCondition.curve === null
          ? []
          : ['The offset depends on wind speed: look for a damaged, loose or wrongly mounted vane first.']
      const change = `${standing < 0 ? '-' : '+'}${Math.abs(standing).toFixed(1)}`
      return [
        ...vaneFirst,
        `Confirm by measurement, then add ${change} degrees to the vane offset.`,
        DESK_CHECK,
        correctionInWords(standing),
      ]
    }
    case 'aligned':
      return ['Nothing to change.']
    case 'blocked':
      return [`No estimate: ${verdict.text}. Mend the log or the sensor first.`]
    case 'undetermined':
      if (verdict.code === 'exponent-not-known') return [`No sign of an offset; ${offset.furtherNote}`]
      return [offset.furtherNote || 'Post more days of this turbine: days, not rows, settle an offset.']
  }
}

/** The correction both ways, at the controller and at the vane. */
export function correctionInWords(standingDeg: number): string {
  const size = Math.abs(standingDeg).toFixed(1)
  const sign = standingDeg < 0 ? '-' : '+'
  const heading = standingDeg < 0 ? 'counter-clockwise' : 'clockwise'
  const mark = standingDeg < 0 ? 'clockwise' : 'counter-clockwise'
  return (
    `After confirmation: add ${sign}${size} degrees to the vane offset of the controller, in steps; the nacelle will stand ${size} degrees further ${heading}. ` +
    `Or mechanically: turn the zero mark of the vane ${size} degrees ${mark}, seen from above.`
  )
}

function whatIsMissing(offset: StaticOffset, standingDeg: number): string[] {
  const lines: string[] = []
  if (!offset.signChecked)
    lines.push('Check the sign of the vane (site file, vane.sign): no number to enter yet.')
  if (offset.vaneLogged === 'unknown') {
    lines.push(
      'Find out whether the logged vane already contains the correction (site file, vane.logged): no number to enter yet.',
    )
  }
  const side = standingDeg < 0 ? 'counter-clockwise' : 'clockwise'
  lines.push(
    `By the sign of the log, the nacelle would have to stand ${Math.abs(standingDeg).toFixed(1)} degrees further ${side}.`,
  )
  return lines
}
