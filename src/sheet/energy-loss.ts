import { Type, type Static } from 'typebox'
import { Interval, Nullable } from './common.ts'

const Count = Type.Integer({ minimum: 0 })

/** What a curve made from operating data is, and what it is not: printed wherever its numbers are. */
export const BINNED_NOT_A_TEST =
  'binned in the manner of IEC 61400-12-1; not a power performance test' as const

const YearAtSpeed = Type.Object({
  meanWindSpeedMs: Type.Number({ description: 'of the year, on the scale of the nacelle anemometer' }),
  distribution: Type.Union([Type.Literal('Rayleigh'), Type.Literal('Weibull')]),
  shape: Type.Number({ description: 'Weibull shape; 2 is Rayleigh' }),
  aepMeasuredMwh: Nullable('energy of the measured curve in 8760 h, no power outside its bins'),
  aepExtrapolatedMwh: Nullable('the same with the last bin held up to cut-out, 25 m/s'),
  measuredShare: Nullable('measured over extrapolated'),
  complete: Type.Boolean({ description: 'false: measured is below 95 % of extrapolated' }),
  staticMwh: Nullable('recoverable in such a year, at the availability of the window'),
  staticInterval95Mwh: Interval('of it, from the interval of m'),
  dynamicMwh: Nullable('lost to the spread of the yaw error in such a year'),
})
export type YearAtSpeed = Static<typeof YearAtSpeed>

const YearAhead = Type.Object({
  basis: Type.Union(
    [Type.Literal('long-term reference'), Type.Literal('range over mean wind speeds'), Type.Literal('none')],
    {
      description:
        'long-term reference: the wind of the window brought to the long-term mean of the site file, or a Weibull distribution where that gives a shape; range: no reference, so that a year is told for several mean wind speeds and the annual numbers stand for the mean of the window alone',
    },
  ),
  meanWindSpeedMs: Nullable('that the annual numbers stand for, on the scale of the nacelle anemometer'),
  windowMeanWindSpeedMs: Nullable('of the window, nacelle anemometer'),
  rangeMwh: Interval(
    'static loss of a year over the mean wind speeds that a year at this place may have, at the estimate of m',
  ),
  rangeMeanWindSpeedMs: Interval('those mean wind speeds'),
  byMeanWindSpeed: Type.Array(YearAtSpeed),
  note: Type.String(),
})

const CurveCheck = Type.Object({
  label: Type.String({ description: BINNED_NOT_A_TEST }),
  hours: Nullable('hours of rows in the curve'),
  hoursNeeded: Type.Number({ description: '180' }),
  minutesNeeded: Type.Number({ description: 'in each bin: 30' }),
  bins: Type.Integer({ minimum: 0, description: 'bins of 0.5 m/s that should be filled' }),
  incompleteBins: Type.Array(
    Type.Object({
      windSpeedMs: Type.Number({ description: 'centre of the bin' }),
      minutes: Type.Number({ description: 'minutes of rows in it' }),
    }),
  ),
  complete: Type.Boolean(),
  note: Type.String(),
})

const SuppliedCurve = Type.Object(
  {
    bins: Type.Array(
      Type.Object({
        windSpeedMs: Type.Number(),
        measuredKw: Type.Number(),
        suppliedKw: Nullable('at the same wind speed'),
        differencePct: Nullable('measured over supplied, less 1'),
      }),
    ),
    aepDifferencePct: Nullable(
      'energy of a year by the measured curve over that by the supplied one, less 1',
    ),
    meanWindSpeedMs: Nullable('of that year, Rayleigh'),
    note: Type.String(),
  },
  { description: 'the curve of the site file beside the measured one; it is used for nothing else' },
)

/** Worth of what a correction recovers, without the cost of a visit. */
export const EnergyValue = Type.Object(
  {
    currency: Type.String(),
    windowPricePerMwh: Nullable('mean price of the energy recoverable in the window'),
    annualPricePerMwh: Nullable('price that the year is valued at'),
    window: Nullable('worth of the static loss of the window'),
    annual: Nullable('worth of it in a year'),
    annualInterval95: Interval('of it'),
    note: Type.String(),
  },
  { description: 'null without a price in the site file' },
)
export type EnergyValue = Static<typeof EnergyValue>

export const EnergyLoss = Type.Object({
  exponent: Type.Number(),
  producedMwh: Nullable('energy of all producing rows of the window'),
  hours: Nullable('hours of rows from which it is known what the turbine did'),
  windowHours: Nullable('hours from the first to the last row'),
  gapHours: Nullable('hours of the window without such rows'),
  gapsScaledBy: Nullable('window hours over hours known: the loss in gaps is taken to be that of the rest'),
  static: Type.Object({
    windowMwh: Nullable('recoverable by a correction, within the window, gaps filled'),
    windowInterval95Mwh: Interval('of it; lower end 0 when the interval of m spans 0'),
    recoverablePctOfProduced: Nullable('recoverable over produced, both from the rows that are there'),
    annualMwh: Nullable('of a year, see yearAhead'),
    annualInterval95Mwh: Interval('of it; lower end 0 when the interval of m spans 0'),
    byMisalignment: Type.Array(
      Type.Object({
        standingDeg: Type.Number(),
        windowMwh: Nullable('if the rotor stood off by this m'),
        annualMwh: Nullable('in a year'),
      }),
      { description: 'what other misalignments would cost here, at the exponent in force' },
    ),
  }),
  dynamic: Type.Object({
    windowMwh: Nullable('lost to the spread of the yaw error; a correction does not recover it'),
    annualMwh: Nullable('of a year'),
  }),
  yearAhead: YearAhead,
  value: Type.Union([EnergyValue, Type.Null()]),
  curveCheck: CurveCheck,
  suppliedCurve: Type.Union([SuppliedCurve, Type.Null()]),
  band: Type.Array(
    Type.Object({
      exponent: Type.Number(),
      offsetDeg: Nullable('d that belongs to this exponent'),
      standingDeg: Nullable('m that belongs to it'),
      staticWindowMwh: Nullable('static loss of the window'),
      staticAnnualMwh: Nullable('annual static loss'),
    }),
  ),
  rows: Count,
  note: Type.String(),
})
export type EnergyLoss = Static<typeof EnergyLoss>
