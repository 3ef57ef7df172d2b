import type { FindingKind } from '../../sheet/index.ts'
import {
  explain,
  ofKinds,
  pick,
  spells,
  WORK_OF_THAT_DAY,
  type Explanation,
  type Rule,
  type RuleInput,
} from './explanation.ts'

const DRIVE: readonly FindingKind[] = [
  'slow-yaw',
  'hunting',
  'overshoot',
  'unbalanced-moves',
  'wide-threshold',
  'cable-twist',
]
const POSITION: readonly FindingKind[] = [
  'zero-lost',
  'slow-slip',
  'missing-pulses',
  'impossible-jump',
  'averaged-across-north',
  'not-usable',
  'frozen',
  'coarse-step',
  'reversed-sign',
]

/** What is said of nacelle position, yaw drive and anemometer: each rule says what it sees, or null. */
export const OTHER_RULES: readonly Rule[] = [
  unexplainedStep,
  positionStep,
  positionSensor,
  drive,
  anemometer,
  northOffset,
]

function unexplainedStep({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, ['unexplained-step'])
  if (findings.length === 0) return null
  return explain(
    64,
    `The heading stepped against the farm ${spells(findings)}, and power cannot tell whether vane or position sensor did it. More days on both sides would; a record of work would at once.`,
    findings,
    [WORK_OF_THAT_DAY],
  )
}

function positionStep({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, ['position-step'])
  if (findings.length === 0) return null
  const steps = findings.length === 1 ? 'stepped' : `stepped ${findings.length} times`
  return explain(
    60,
    `The nacelle position ${steps} (${spells(findings)}) while power against the vane did not change: the position sensor or its north parameter alone. The vane is untouched, its offset holds on both sides, and nobody needs to climb to the vane for this.`,
    findings,
  )
}

function positionSensor({ sheet }: RuleInput): Explanation | null {
  const findings = pick(
    sheet,
    ({ sensor, kind, severity }) =>
      sensor === 'nacelle-position' && POSITION.includes(kind) && severity !== 'info',
  )
  if (findings.length === 0) return null
  const kinds = [...new Set(findings.map(({ kind }) => POSITION_CAUSES[kind] ?? 'the sensor'))]
  return explain(
    56,
    `Nacelle position: ${kinds.join('; ')}. Offset and yaw error come from the vane and power and do not lean on it.`,
    findings,
  )
}

const POSITION_CAUSES: Partial<Record<FindingKind, string>> = {
  'zero-lost': 'it loses its zero at stops, as a counter without a buffered count does',
  'slow-slip': 'it slips slowly, as a loose coupling or gear does',
  'missing-pulses': 'pulses are missed while the nacelle turns: switches, teeth, or a wrong gear ratio',
  'impossible-jump': 'it jumps faster than a nacelle can turn: signal or logger, not the drive',
  'averaged-across-north': 'the logger averages it over the end of its scale: a matter of the logger alone',
  'not-usable': 'the channel does not follow the nacelle at all',
  frozen: 'it stood still while the nacelle turned',
  'coarse-step': 'it is read in coarse steps',
  'reversed-sign': 'it counts the other way round',
}

function drive({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, DRIVE)
  if (findings.length === 0) return null
  const noisy = pick(
    sheet,
    ({ sensor, kind }) => sensor === 'vane' && ['noise-changed', 'spikes'].includes(kind),
  )
  const hunting = findings.some(({ kind }) => kind === 'hunting')
  const text =
    hunting && noisy.length > 0
      ? 'The nacelle hunts after a vane that is noisy: mend the vane before the drive is looked at.'
      : `Yaw drive and controller: ${[...new Set(findings.map(({ kind }) => DRIVE_CAUSES[kind] ?? kind))].join('; ')}. This adds to the dynamic yaw error and to wear; a vane offset does not cure it.`
  return explain(58, text, findings)
}

const DRIVE_CAUSES: Partial<Record<FindingKind, string>> = {
  'slow-yaw': 'it turns slowly (a motor, a brake or a frequency converter)',
  hunting: 'it goes back and forth within minutes (threshold or averaging time)',
  overshoot: 'it turns on past its stop (brake)',
  'unbalanced-moves': 'it treats the two sides unequally (thresholds, or friction on one side)',
  'wide-threshold': 'it waits for a larger yaw error than its neighbours (a parameter)',
  'cable-twist': 'the cables twist further than they should (twist counter, or untwist switched off)',
}

function anemometer({ sheet }: RuleInput): Explanation | null {
  const findings = pick(
    sheet,
    ({ sensor, severity, kind }) =>
      sensor === 'anemometer' && (severity !== 'info' || kind === 'yaw-response') && kind !== 'yaw-response',
  )
  if (findings.length === 0) return null
  const kinds = new Set(findings.map(({ kind }) => kind))
  const ice = kinds.has('icing')
  const gain = kinds.has('gain-off') || kinds.has('gain-drift')
  const parts = [
    ...(ice ? ['it iced, which passes by itself and asks for a look at its heating'] : []),
    ...(kinds.has('frozen') ? ['it stood still'] : []),
    ...(gain
      ? [
          'its gain differs from its neighbours’ or changed, which bends this turbine’s power curve and its loss, but not an offset that was found from rows with one gain',
        ]
      : []),
  ]
  return explain(54, `Anemometer: ${parts.length > 0 ? parts.join('; ') : 'see the findings'}.`, findings)
}

function northOffset({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, ['north-offset'])
  if (findings.length === 0) return null
  return explain(
    10,
    'The north of its position is not that of the farm: a parameter, from which no yaw error follows.',
    findings,
  )
}
