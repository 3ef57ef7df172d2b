import { Type, type Static } from 'typebox'
import { Interval, IsoTime, Nullable } from './common.ts'

/** What is known of a nacelle position's north. N + v less the true direction is n - d: never n alone. */
export const NacelleNorth = Type.Object({
  state: Type.Union(
    [
      Type.Literal('compared'),
      Type.Literal('zero-lost'),
      Type.Literal('unrelated'),
      Type.Literal('reversed'),
      Type.Literal('alone'),
      Type.Literal('missing'),
    ],
    {
      description:
        'compared: against the farm; zero-lost: another zero again and again; unrelated: the reading has nothing to do with the wind; reversed: its sign is wrong; alone: fewer than two others to compare with; missing: none in the log',
    },
  ),
  northMinusVaneOffsetDeg: Nullable(
    'n - d at the end of the window, against the consensus of the farm, whose own north is not known: the median turbine has 0',
  ),
  interval95Deg: Interval('of it'),
  northOffsetDeg: Nullable(
    'n on the same scale: the above plus d, where d is known. An error: what is entered is minus this, once the scale is tied to true north',
  ),
  northInterval95Deg: Interval('of it; holds the interval of d'),
  pieces: Type.Array(
    Type.Object({
      from: IsoTime('start'),
      to: IsoTime('end'),
      northMinusVaneOffsetDeg: Type.Number(),
      interval95Deg: Interval('of it'),
    }),
    { description: 'time with one n - d, against the consensus' },
  ),
  absolute: Type.Union(
    [
      Type.Object({
        source: Type.Union([Type.Literal('wakes'), Type.Literal('surveyed')], {
          description: 'what ties the consensus to true north',
        }),
        northMinusVaneOffsetDeg: Nullable('n - d against true north, at the end of the window'),
        interval95Deg: Interval('of it'),
        northOffsetDeg: Nullable('n against true north, where d is known'),
        northInterval95Deg: Interval('of it'),
        note: Type.String(),
      }),
      Type.Null(),
    ],
    { description: 'null: nothing ties the consensus to true north' },
  ),
  resolutionDeg: Nullable('step of the reading; null where rows are means of many readings'),
  note: Type.String(),
})
export type NacelleNorth = Static<typeof NacelleNorth>

/** What ties the farm's consensus direction to true north. */
export const FarmNorthTie = Type.Object({
  source: Type.Union([Type.Literal('wakes'), Type.Literal('surveyed')]),
  shiftDeg: Type.Number({
    description: 'added to n - d against the consensus it gives n - d against true north',
  }),
  interval95Deg: Interval('of it'),
  note: Type.String(),
})
export type FarmNorthTie = Static<typeof FarmNorthTie>
