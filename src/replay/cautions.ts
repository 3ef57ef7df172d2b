import type { TurbineSheet } from '../sheet/index.ts'

/**
 * What every sheet and list carries that could lead to a climb or to a changed parameter.
 * The program recommends; it never controls.
 */
export const CAUTIONS: readonly string[] = [
  'This is an estimate from operating data. Confirm it by an independent measurement, or by the alignment procedure of the manufacturer, before anything is changed.',
  'Check on the controller which sign a larger vane offset has, and whether the logged vane already contains the correction: enter a small trial step first and see which way the nacelle turns.',
  'Change no more than half of the value or 5 degrees at once. Keep the as-found value. Watch yaw activity, loads and alarms; look for the step in heading after a day or two, and for power later.',
  'Beyond 10 degrees, or where the offset depends on wind speed: look for a damaged, loose or wrongly mounted vane first, and tell the manufacturer or certifier, because a rotor that stands off the wind carries added loads.',
  'Work on the turbine is for authorised, licensed technicians with the manufacturer’s manual: turbine stopped, rotor locked, yaw drive isolated, locked out and tagged, cable twist checked, within the weather limits, with a fall-protection and rescue plan.',
  'No remote change while anybody is in the turbine. Mind the site permit, the warranty and the duties towards the grid operator. Local rules come first.',
]

/** What is said of an offset that depends on wind speed; empty where it does not. */
export function curveCaution({
  byCondition: { curve },
}: Pick<TurbineSheet['staticOffset'], 'byCondition'>): string[] {
  const [first, last] = [curve?.at(0), curve?.at(-1)]
  if (!first || !last) return []
  const at = ({ windSpeedMs, standingMisalignmentDeg }: typeof first): string =>
    `${(standingMisalignmentDeg ?? NaN).toFixed(1)} degrees at ${windSpeedMs} m/s`
  return [
    `The offset depends on wind speed, ${at(first)} to ${at(last)}: look for a damaged, loose or wrongly mounted vane first. One number is wrong at both ends; the sheet holds a table for the controller (staticOffset.byCondition.curve).`,
  ]
}

/** The same in one line, for the end of a printed table. */
export const CAUTION_IN_SHORT =
  'Estimates from operating data: confirm by an independent measurement first. Work on a turbine only by authorised technicians, ' +
  'locked out, by the manufacturer’s manual and local rules. Full cautions are in the sheet.'
