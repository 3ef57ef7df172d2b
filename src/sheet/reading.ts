import { Type, type Static } from 'typebox'

/** One entry of an explicit column map: the column of the log, and the unit it is in when that is not the canonical one. */
export const ColumnSource = Type.Union([
  Type.String({ minLength: 1, maxLength: 300, description: 'column of the log' }),
  Type.Object(
    {
      column: Type.String({ minLength: 1, maxLength: 300 }),
      unit: Type.Optional(Type.String({ maxLength: 20, examples: ['km/h', 'W', 'K'] })),
    },
    { additionalProperties: false },
  ),
])
export type ColumnSource = Static<typeof ColumnSource>

/** How a log is to be read, where the caller knows better than the sniffer. */
export const ReadingOptions = Type.Object(
  {
    timezone: Type.Optional(
      Type.String({
        minLength: 1,
        maxLength: 60,
        description: 'IANA zone of stamps without an offset; default: site file, then UTC',
      }),
    ),
    stamp: Type.Optional(
      Type.Union([Type.Literal('begin'), Type.Literal('end')], {
        description: 'which edge of its interval a time stamp marks; default: site file, then begin',
      }),
    ),
    columns: Type.Optional(
      Type.Record(Type.String(), ColumnSource, {
        description: 'canonical channel -> column of the log; named columns win over recognised ones',
      }),
    ),
    turbine: Type.Optional(
      Type.String({
        minLength: 1,
        maxLength: 100,
        description: 'name of the turbine when the log has no turbine column',
      }),
    ),
    startDate: Type.Optional(
      Type.String({
        pattern: '^\\d{4}-\\d{2}-\\d{2}$',
        description: 'date of the lowest day number, for logs with a day number and a clock',
      }),
    ),
    dateOrder: Type.Optional(
      Type.Union([Type.Literal('ymd'), Type.Literal('dmy'), Type.Literal('mdy')], {
        description: 'order of year, month and day in written dates, where the log leaves it open',
      }),
    ),
  },
  { additionalProperties: false, description: 'Reading options' },
)
export type ReadingOptions = Static<typeof ReadingOptions>
