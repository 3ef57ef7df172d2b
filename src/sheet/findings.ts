import { Type, type Static } from 'typebox'
import { NullableIsoTime } from './common.ts'

/** What can be wrong with a sensor, the yaw drive or the controller. Stable words: programs select by them. */
export const FINDING_KINDS = [
  'not-usable',
  'reversed-sign',
  'clock-off',
  'frozen',
  'icing',
  'dead-sector',
  'stuck-bit',
  'coarse-step',
  'noise-changed',
  'spikes',
  'two-vanes-apart',
  'no-longer-leads',
  'idle-bias',
  'north-offset',
  'position-step',
  'unexplained-step',
  'zero-lost',
  'slow-slip',
  'impossible-jump',
  'averaged-across-north',
  'missing-pulses',
  'gain-off',
  'gain-drift',
  'yaw-response',
  'slow-yaw',
  'hunting',
  'overshoot',
  'unbalanced-moves',
  'wide-threshold',
  'deliberate-yaw',
  'cable-twist',
] as const
export type FindingKind = (typeof FINDING_KINDS)[number]

/** One thing that was found at a sensor, the yaw drive or the controller. */
export const SensorFinding = Type.Object({
  sensor: Type.Union([
    Type.Literal('vane'),
    Type.Literal('nacelle-position'),
    Type.Literal('anemometer'),
    Type.Literal('yaw-drive'),
    Type.Literal('controller'),
    Type.Literal('power'),
    Type.Literal('air'),
    Type.Literal('clock'),
  ]),
  kind: Type.Unsafe<FindingKind>({ type: 'string', enum: [...FINDING_KINDS] }),
  finding: Type.String({ description: 'one sentence with its numbers' }),
  severity: Type.Union([Type.Literal('info'), Type.Literal('warn'), Type.Literal('fault')]),
  howSure: Type.Union([Type.Literal('certain'), Type.Literal('likely'), Type.Literal('possible')]),
  checkFirst: Type.String({ description: 'what to look at first, desk checks before climbs' }),
  from: NullableIsoTime('start'),
  to: NullableIsoTime('end'),
  detail: Type.Record(Type.String(), Type.Unknown()),
})
export type SensorFinding = Static<typeof SensorFinding>

/** A test of a sensor, and whether the log allowed it. */
export const SensorTest = Type.Object({
  sensor: SensorFinding.properties.sensor,
  test: Type.String({ description: 'what is looked for' }),
  done: Type.Boolean(),
  note: Type.String({ description: 'what it ran on, or what is missing for it' }),
})
export type SensorTest = Static<typeof SensorTest>

/** Weighs the findings of one turbine. */
export const Attribution = Type.Object({
  text: Type.String({ description: 'one paragraph' }),
  evidence: Type.Array(Type.String()),
  wouldSettle: Type.Array(Type.String({ description: 'checks that would settle it, desk checks first' })),
})
export type Attribution = Static<typeof Attribution>
