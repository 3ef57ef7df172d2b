import { Type } from 'typebox'
import { Nullable, Receipt } from '../sheet/index.ts'

const NullableText = (description: string) => Type.Union([Type.String(), Type.Null()], { description })

/** How one log would be read: what a dry run answers. */
export const LogDescription = Type.Object(
  {
    name: Type.String(),
    encoding: Type.String(),
    form: NullableText('kind of log: one row a line, one column a turbine, one value a line, json, ...'),
    delimiter: NullableText('between the fields of a line'),
    decimalComma: Type.Union([Type.Boolean(), Type.Null()]),
    headerLine: Nullable('line number of the header, 1 = first'),
    timeFormat: NullableText('how time stamps are written'),
    timezone: Type.String({ description: 'zone of stamps without an offset' }),
    stamp: Type.Union([Type.Literal('begin'), Type.Literal('end')]),
    intervalS: Nullable('length of the interval, s'),
    columns: Receipt.properties.columns,
    firstRows: Type.Array(Type.Record(Type.String(), Type.Unknown()), {
      description: 'first rows as understood: ISO 8601 and canonical units',
    }),
    rejectedByReason: Receipt.properties.rejectedByReason,
    missing: Type.Array(Type.String(), { description: 'channels that the scoring wants and the log lacks' }),
    warnings: Type.Array(Type.String()),
    problem: Type.Union([Type.Object({ code: Type.String(), message: Type.String() }), Type.Null()], {
      description: 'what would stop the reading',
    }),
  },
  { description: 'How a log would be read' },
)

export const DryRun = Type.Object(
  { logs: Type.Array(LogDescription, { description: 'one entry a log, in the order they were sent' }) },
  { description: 'How logs would be read, from their beginning; nothing is kept' },
)
