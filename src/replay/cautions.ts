import type { TurbineSheet } from '../sheet/index.ts'

/**
 * What every sheet and list carries that could lead to a climb or to a changed parameter.
 * The program recommends; it never controls.
 */
export const CAUTIONS: readonly string[] = [
  'This is an estimate from operating data. Confirm it by an independent measurement, or by the alignment procedure of the manufacturer, before anything is changed.',
  'Find out on the controller itself which way a larger vane offset turns the nacelle, and whether the logged vane already contains the correction: enter a small trial step first and watch the nacelle.',
  'Change no more than half of the value, and no more than 5 degrees, at once. Write down the value as found and keep it. Afterwards watch yaw activity, loads and alarms; look for the step in heading after a day or two, and for the power some weeks later.',
  'Beyond 10 degrees, or where the offset depends on wind speed: look for a damaged, loose or wrongly mounted vane first, and tell the manufacturer or the certifier, because a rotor that runs off the wind carries added loads.',
  'Work on the turbine is for competent, authorised persons with the manual of the manufacturer: turbine stopped, rotor locked, yaw drive isolated, locked out and tagged, cable twist checked, within the weather limits, with fall protection and a rescue plan, and with the permit of the site.',
  'No remote change of a parameter, and no remote start, while anybody is in the turbine.',
  'Mind the warranty and the duties towards the grid operator before a parameter is changed.',
  'Local rules come first, whatever this list says.',
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
