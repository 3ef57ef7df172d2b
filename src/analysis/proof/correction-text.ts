import type { CorrectionProof } from '../../sheet/index.ts'
import type { HeadingStep } from '../changes/offset-changes-heading.ts'
import type { Judgement } from './judge-correction.ts'

type Told = Pick<
  CorrectionProof,
  'outcome' | 'furtherDays' | 'heading' | 'gainPct' | 'interval95Pct' | 'predictedPct'
>

interface Said extends Told {
  readonly enteredDeg: number
  readonly code: Judgement['code']
  /** m by the rows of each side, degrees; NaN: not known. */
  readonly standing: { readonly before: number; readonly after: number }
  /** A step of the heading that may be the correction at another date. */
  readonly like: HeadingStep | null
}

/** What became of a correction, why, and what to do next, in words. */
export function correctionText(said: Said): Pick<CorrectionProof, 'urgent' | 'reason' | 'advice'> {
  const urgent = said.outcome === 'wrong way'
  return { urgent, reason: reasonOf(said), advice: adviceOf(said) }
}

function reasonOf(said: Said): string {
  const heading = headingWords(said)
  const power = powerWords(said)
  const both = [heading, power].filter((words) => words !== '').join('; ')
  switch (said.code) {
    case 'heading-other-way':
      return `The rotor was turned the other way: ${both}.`
    case 'further-off':
      return `The correction took hold as entered and turned the rotor further off the wind, as it stood at ${degrees(said.standing.before)} before: ${both}.`
    case 'power-lower':
      return `Power fell against unchanged neighbours, beyond what placebos show: ${both}.`
    case 'vane-other-way':
      return `Power against vane puts the misalignment at ${degrees(said.standing.before)} before and ${degrees(said.standing.after)} after: the other way than entered${both === '' ? '' : `; ${both}`}.`
    case 'heading-still':
      return said.like === null
        ? `The heading did not step: what was entered is not in force. ${sentence(both)}`
        : `The heading did not step at the time given, but by ${degrees(said.like.sizeDeg)} about ${new Date(said.like.atMs).toISOString().slice(0, 10)}: look at the date. ${sentence(both)}`
    case 'heading-in-part':
      return `The heading stepped by less than was entered: ${both}.`
    case 'power-higher':
      return `It took hold and power rose against unchanged neighbours: ${both}.`.replace(
        'It took hold and power',
        said.heading.seenIn === null ? 'Power' : 'It took hold and power',
      )
    case 'offset-smaller':
      return `${said.heading.seenIn === null ? 'Power against vane' : 'The heading, and power against vane,'} put the misalignment at ${degrees(said.standing.before)} before and ${degrees(said.standing.after)} after; power against neighbours allows the gain and does not show it by itself: ${both}.`
    case 'power-same':
      return `Power did not change by what the correction should give: ${both}.`
    case 'power-too-fine':
      return `The gain to be expected is too small for power to show against chance: ${both}.`
    case 'waiting-for-heading':
      return `The heading cannot tell yet: ${both}.`
    case 'waiting-for-power':
      return `Power cannot tell yet: ${both}.`
    case 'no-evidence':
      return both === ''
        ? 'Neither heading nor power can be compared: no unchanged neighbours, or too few rows on one side.'
        : `Power cannot be compared: no unchanged neighbours, or too few rows on one side; ${both}.`
  }
}

function headingWords({ heading, enteredDeg }: Said): string {
  if (heading.seenIn === null) return ''
  const [low, high] = heading.interval95Deg
  return `${heading.seenIn} stepped by ${degrees(heading.stepDeg)} [${number(low)}, ${number(high)}] where ${degrees(enteredDeg)} were entered`
}

function powerWords({ gainPct, interval95Pct, predictedPct }: Said): string {
  if (gainPct === null) return ''
  const [low, high] = interval95Pct
  const predicted = predictedPct === null ? '' : `, ${number(predictedPct)} % were to be expected`
  return `power below rated changed by ${number(gainPct)} % [${number(low)}, ${number(high)}]${predicted}`
}

function adviceOf({ outcome, enteredDeg, furtherDays, code }: Said): string {
  switch (outcome) {
    case 'wrong way':
      return code === 'heading-other-way' || code === 'vane-other-way'
        ? `Undo it: put the parameter back to its value as found, and check the sign of the controller’s parameter before ${degrees(enteredDeg)} are entered again in a small step.`
        : 'Undo it: put the parameter back to its value as found, check the sign of the misalignment, and measure it by other means before anything is entered again.'
    case 'not taken hold':
      return 'Look whether the parameter was saved and is in force, at the right turbine and at the time given; then enter it again.'
    case 'partly':
      return 'Read the parameter: a limit, a smaller step or a second correction may be in force.'
    case 'no effect seen':
      return 'The rotor was turned and power does not show it: let the misalignment be measured by other means before more is entered.'
    case 'worked':
      return 'Keep it. Note the value as left, and look at power again after some months.'
    case 'too early':
      return furtherDays === null
        ? 'More days will not settle it by themselves: nacelle position in the log, a longer time before the correction, or unchanged neighbours would.'
        : `Score again with about ${furtherDays} more ${furtherDays === 1 ? 'day' : 'days'} of rows.`
  }
}

function sentence(words: string): string {
  return words === '' ? '' : `${words.charAt(0).toUpperCase()}${words.slice(1)}.`
}

function degrees(value: number | null): string {
  return `${number(value)} degrees`
}

function number(value: number | null | undefined): string {
  if (value === null || value === undefined || !Number.isFinite(value)) return '?'
  const text = value.toFixed(1)
  return value > 0 && Number(text) !== 0 ? `+${text}` : Number(text) === 0 ? '0.0' : text
}
