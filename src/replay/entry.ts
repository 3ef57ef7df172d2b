import type { StaticOffsetAnswer } from '../analysis/index.ts'
import type { TurbineSheet } from '../sheet/index.ts'
import { mayEnter } from './advice.ts'

type StaticOffset = TurbineSheet['staticOffset']

/** Gains at which the sheet says what the numbers would be. */
const SHOWN_GAINS = [0.9, 1.1, 1.3] as const

/** What is entered where, and the assumptions behind it: the kind of logged vane, and that its gain is 1. */
export function entryOf(
  offset: Omit<StaticOffset, 'entry'>,
  question: {
    verdict: TurbineSheet['verdict']
    correctionDeg: number | undefined
    standing: StaticOffsetAnswer['standing']
  },
): StaticOffset['entry'] {
  const { standing, correctionDeg } = question
  const standingDeg = standing?.standingDeg ?? NaN
  const enterDeg = mayEnter(offset, question.verdict) ? standingDeg : NaN
  const travelled = standing?.gainInEstimate === 1
  return {
    addToVaneDeg: enterDeg,
    vaneOffsetAfterDeg: enterDeg + (correctionDeg ?? NaN),
    turnMarkDeg: -enterDeg,
    text: standing ? vaneInWords(offset.vaneLogged, standing) : 'no offset, and so nothing to enter',
    vaneGain: {
      assumed: 1,
      text: travelled
        ? 'The vane is taken to read one degree for each degree of wind (gain 1). What the rotor stands off is found without that; of a vane that reads k degrees for each, k times m would have to be entered.'
        : 'The vane is taken to read one degree for each degree of wind (gain 1). Of one that reads k degrees for each, the slope of power finds d / k^2: the rotor would stand off k times m, and k^2 times m would have to be entered.',
      ifGain: SHOWN_GAINS.map((gain) => ({
        gain,
        standsOffDeg: travelled ? standingDeg : gain * standingDeg,
        enterDeg: (travelled ? gain : gain * gain) * standingDeg,
      })),
    },
  }
}

function vaneInWords(
  logged: StaticOffset['vaneLogged'],
  { offsetDeg, standingDeg }: NonNullable<StaticOffsetAnswer['standing']>,
): string {
  const meanDeg = standingDeg - offsetDeg
  const sum = `m = d + mean vane = ${signed(offsetDeg)} ${meanDeg < 0 ? '-' : '+'} ${Math.abs(meanDeg).toFixed(1)} = ${signed(standingDeg)}`
  switch (logged) {
    case 'afterCorrection':
      return `The logged vane already contains the controller's correction: ${sum} is what is left to correct, and is added to the vane offset in force.`
    case 'beforeCorrection':
      return `The logged vane is the one before the controller's correction, so that its mean is minus that correction: d is the whole correction that the vane needs, and ${sum} is what is left to add to the vane offset in force.`
    case 'unknown':
      return `Whether the logged vane already contains the controller's correction is not known. Either way ${sum} is what is left to correct; d is the whole correction only where the vane is logged before it.`
  }
}

function signed(value: number): string {
  return `${value < 0 ? '-' : '+'}${Math.abs(value).toFixed(1)}`
}
