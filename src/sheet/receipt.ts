import { Type, type Static } from 'typebox'
import { NullableIsoTime, Nullable } from './common.ts'

const ReasonCount = Type.Object({
  reason: Type.String(),
  rows: Type.Integer({ minimum: 0 }),
  firstLine: Type.Union([Type.Integer({ minimum: 1 }), Type.Null()], {
    description: 'line number in the file as it was sent, 1 = first',
  }),
  firstText: Type.Union([Type.String(), Type.Null()], { description: 'the start of that line' }),
})

/** The account of one posted log: received = accepted + duplicate + rejected, always. */
export const Receipt = Type.Object({
  received: Type.Integer({
    minimum: 0,
    description: 'data rows: all lines but header, preamble and blank ones',
  }),
  accepted: Type.Integer({ minimum: 0 }),
  duplicate: Type.Integer({
    minimum: 0,
    description: 'rows overruled by a later row of the same turbine and time',
  }),
  rejected: Type.Integer({ minimum: 0 }),
  rejectedByReason: Type.Array(ReasonCount),
  blankLines: Type.Integer({ minimum: 0, description: 'lines without any text; not rows' }),
  first: NullableIsoTime('start of the first accepted interval'),
  last: NullableIsoTime('start of the last accepted interval'),
  intervalS: Nullable('length of the interval, s: the commonest step in time'),
  turbines: Type.Array(Type.Object({ turbine: Type.String(), rows: Type.Integer({ minimum: 0 }) })),
  columns: Type.Array(
    Type.Object({
      column: Type.String({ description: 'as named in the log' }),
      takenFor: Type.Union([Type.String(), Type.Null()], {
        description: 'canonical channel, null = not used',
      }),
      unit: Type.Union([Type.String(), Type.Null()], { description: 'unit it was read in' }),
      why: Type.String(),
      unreadable: Type.Integer({
        minimum: 0,
        description: 'cells with text that is no number; they count as missing',
      }),
      outOfRange: Type.Integer({
        minimum: 0,
        description: 'cells outside physical limits or known sentinels; they count as missing',
      }),
      missing: Type.Integer({ minimum: 0, description: 'cells missing in the end, for whatever cause' }),
    }),
  ),
  inputs: Type.Array(
    Type.Object({ name: Type.String(), sha256: Type.String(), rows: Type.Integer({ minimum: 0 }) }),
  ),
  warnings: Type.Array(Type.String()),
})
export type Receipt = Static<typeof Receipt>
