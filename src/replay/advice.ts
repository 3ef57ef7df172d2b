import type { Verdict } from '../analysis/index.ts'
import type { TurbineSheet } from '../sheet/index.ts'

type StaticOffset = TurbineSheet['staticOffset']

/** The most that is changed at once, degrees, and as a share of the whole. */
const LARGEST_STEP_DEG = 5
const STEP_SHARE = 0.5

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
      return [
        ...vaneFirst,
        `Confirm by measurement, then add ${signedDeg(standing)} degrees to the vane offset.`,
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

/** Half of the change and 5 degrees at most, to a tenth of a degree. */
export function firstStepDeg(standingDeg: number): number {
  const size = Math.min(STEP_SHARE * Math.abs(standingDeg), LARGEST_STEP_DEG)
  return Math.sign(standingDeg) * (Math.round(10 * size) / 10)
}

/** The correction both ways, at the controller and at the vane. */
export function correctionInWords(standingDeg: number): string {
  const size = Math.abs(standingDeg).toFixed(1)
  const mark = standingDeg < 0 ? 'clockwise' : 'counter-clockwise'
  return (
    `After confirmation, enter ${signedDeg(standingDeg)} degrees more vane offset at the controller: the nacelle will stand ${size} degrees further ${sideOf(standingDeg)}. ` +
    `Or mechanically, and not both: turn the zero mark of the vane ${size} degrees ${mark}, seen from above. ` +
    `In steps: ${signedDeg(firstStepDeg(standingDeg))} first, the rest when the step in heading has been seen.`
  )
}

/** What must be known before a number may be entered, and which way it would be. */
export function whatIsMissing(offset: StaticOffset, standingDeg: number): string[] {
  const lines: string[] = []
  if (!offset.signChecked)
    lines.push('Check the sign of the vane (site file, vane.sign): no number to enter yet.')
  if (offset.vaneLogged === 'unknown') {
    lines.push(
      'Find out whether the logged vane already contains the correction (site file, vane.logged): no number to enter yet.',
    )
  }
  lines.push(
    `By the sign of the log, the nacelle would have to stand ${Math.abs(standingDeg).toFixed(1)} degrees further ${sideOf(standingDeg)}.`,
  )
  return lines
}

/** +6.1, -0.4. */
export function signedDeg(value: number): string {
  return `${value < 0 ? '-' : '+'}${Math.abs(value).toFixed(1)}`
}

function sideOf(standingDeg: number): string {
  return standingDeg < 0 ? 'counter-clockwise' : 'clockwise'
}
