import { Type, type Static } from 'typebox'
import { Interval, IsoTime, Nullable, NullableIsoTime } from './common.ts'

/** Whether a correction did what it was entered for. */
export const CORRECTION_OUTCOMES = [
  'worked',
  'partly',
  'no effect seen',
  'not taken hold',
  'wrong way',
  'too early',
] as const
export type CorrectionOutcome = (typeof CORRECTION_OUTCOMES)[number]

const Count = Type.Integer({ minimum: 0 })

/** One correction of the site file, held against the rows before and after it. */
export const CorrectionProof = Type.Object({
  turbine: Type.String(),
  at: IsoTime('when it was entered'),
  enteredDeg: Type.Number({ description: 'as the site file says; positive turns the nacelle clockwise' }),
  note: Type.Union([Type.String(), Type.Null()], { description: 'of the site file' }),
  outcome: Type.Unsafe<CorrectionOutcome>({
    type: 'string',
    enum: [...CORRECTION_OUTCOMES],
    description:
      'wrong way: the rotor stands further off than before, undo it; partly: the heading stepped by less than was entered, never told from power alone; too early: furtherDays are needed',
  }),
  urgent: Type.Boolean({ description: 'somebody should act on it now' }),
  reason: Type.String({ description: 'one or two sentences with their numbers' }),
  advice: Type.String({ description: 'what to do next' }),
  furtherDays: Nullable(
    'more days after the correction until it can be judged; null: none, or days will not settle it',
  ),
  window: Type.Object({
    beforeFrom: NullableIsoTime('first moment before the correction that is compared'),
    beforeTo: NullableIsoTime('end of it: hours around the correction are left out'),
    afterFrom: NullableIsoTime('first moment after the correction that is compared'),
    afterTo: NullableIsoTime('end of it: the next change, or the end of the window'),
  }),
  heading: Type.Object(
    {
      seenIn: Type.Union(
        [
          Type.Literal('nacelle position + vane'),
          Type.Literal('nacelle position'),
          Type.Literal('vane'),
          Type.Null(),
        ],
        {
          description:
            'what must step by the degrees entered: nacelle position + vane against the farm where the log holds the vane after its correction, nacelle position where it holds the vane before it or where that is not known; vane: its mean, before correction, without nacelle position',
        },
      ),
      expectedDeg: Nullable('step if it took hold as entered'),
      stepDeg: Nullable('step seen, clockwise positive'),
      interval95Deg: Interval('of the step'),
      daysBefore: Count,
      daysAfter: Count,
    },
    { description: 'did it take hold' },
  ),
  vaneLoggedSeen: Type.Union(
    [Type.Literal('beforeCorrection'), Type.Literal('afterCorrection'), Type.Null()],
    { description: 'what the step tells of the logged vane; null where it tells nothing' },
  ),
  standing: Type.Object(
    {
      beforeDeg: Nullable('m before'),
      beforeInterval95Deg: Interval('of it'),
      afterDeg: Nullable('m after'),
      afterInterval95Deg: Interval('of it'),
      changeDeg: Nullable('after less before, from power against vane on each side'),
      changeInterval95Deg: Interval('of the change; what both sides share is not in it'),
    },
    { description: 'misalignment estimated anew on each side' },
  ),
  gainPct: Nullable('power after against before, relative to unchanged neighbours, % of energy below rated'),
  interval95Pct: Interval('of the gain; its width is at least what placebos show'),
  predictedPct: Nullable('gain by the cosine law from m before and the degrees entered'),
  predictedInterval95Pct: Interval('of the prediction, from that of m at the exponent in force'),
  power: Type.Object({
    neighbours: Type.Array(Type.String({ description: 'turbines at which nothing was changed' })),
    rowsBefore: Count,
    rowsAfter: Count,
    daysBefore: Count,
    daysAfter: Count,
    bySector: Type.Array(
      Type.Object({ fromDeg: Type.Number(), toDeg: Type.Number(), gainPct: Nullable('in it'), rows: Count }),
    ),
    byWindSpeed: Type.Array(
      Type.Object({ fromMs: Type.Number(), toMs: Type.Number(), gainPct: Nullable('in it'), rows: Count }),
    ),
  }),
  placebos: Type.Object(
    {
      spreadPct: Nullable('root mean square of the gains where nothing was done, as for this correction'),
      beyondChance: Count,
      list: Type.Array(
        Type.Object({
          turbine: Type.String(),
          at: IsoTime('the date that was tried'),
          gainPct: Type.Number(),
        }),
      ),
    },
    {
      description:
        'the same comparison where nothing was done: unchanged neighbours at this date, and earlier dates',
    },
  ),
})
export type CorrectionProof = Static<typeof CorrectionProof>
