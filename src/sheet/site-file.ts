import { Type, type Static } from 'typebox'
import { IsoTime } from './common.ts'

const Name = Type.String({ minLength: 1, maxLength: 100, pattern: '^[^\\u0000-\\u001f/]+$' })

/** How an angle stands in a sensor, and which way it counts. */
const zeroDeg = Type.Optional(
  Type.Number({
    minimum: -360,
    maximum: 360,
    description: 'angle at the raw word, ratio or count 0, degrees; default 0',
  }),
)
const direction = Type.Optional(
  Type.Union([Type.Literal(1), Type.Literal(-1)], {
    description: '1: raw words rise clockwise, seen from above; -1: counter-clockwise; default 1',
  }),
)
const bits = Type.Optional(
  Type.Integer({ minimum: 1, maximum: 52, description: 'of an absolute encoder: 2^bits codes a turn' }),
)
const code = Type.Optional(
  Type.Union([Type.Literal('gray'), Type.Literal('binary')], { description: 'of its words; default gray' }),
)

export const TurbineSetup = Type.Object(
  {
    turbine: Name,
    model: Type.Optional(
      Type.String({
        maxLength: 100,
        description: 'turbines of one model share what is learned about their anemometers',
      }),
    ),
    ratedPowerKw: Type.Optional(Type.Number({ exclusiveMinimum: 0, maximum: 50000, description: 'kW' })),
    rotorDiameterM: Type.Optional(Type.Number({ exclusiveMinimum: 0, maximum: 500 })),
    hubHeightM: Type.Optional(Type.Number({ exclusiveMinimum: 0, maximum: 500 })),
    altitudeM: Type.Optional(
      Type.Number({ minimum: -500, maximum: 6000, description: 'of the foot of the tower, above sea level' }),
    ),
    eastingM: Type.Optional(Type.Number()),
    northingM: Type.Optional(Type.Number()),
    vane: Type.Optional(
      Type.Object(
        {
          logged: Type.Optional(
            Type.Union(
              [Type.Literal('beforeCorrection'), Type.Literal('afterCorrection'), Type.Literal('unknown')],
              {
                description: "whether the logged vane already contains the controller's own correction",
              },
            ),
          ),
          correctionDeg: Type.Optional(
            Type.Number({
              minimum: -180,
              maximum: 180,
              description: "the controller's vane offset in force",
            }),
          ),
          sign: Type.Optional(
            Type.Union([Type.Literal(1), Type.Literal(-1)], {
              description:
                '1: positive = wind from clockwise of the axis, seen from above; -1: the reverse. Stated here it counts as checked',
            }),
          ),
          centre: Type.Optional(
            Type.Union([Type.Literal(0), Type.Literal(180)], {
              description:
                'what the vane reads when the rotor faces the wind; default: told from the rows that produce',
            }),
          ),
          kind: Type.Optional(
            Type.Union([Type.Literal('encoder'), Type.Literal('potentiometer'), Type.Literal('ultrasonic')], {
              description:
                'what the vane is: raw words are decoded from vane_code, vane_ratio or transit_1, ...; default: told by what the log holds',
            }),
          ),
          bits,
          code,
          zeroDeg,
          direction,
          deadBandDeg: Type.Optional(
            Type.Number({
              minimum: 0,
              maximum: 90,
              description:
                'gap of the track of a potentiometer, degrees; the ratios 0 to 1 span 360 less the gap',
            }),
          ),
        },
        { additionalProperties: false },
      ),
    ),
    nacelle: Type.Optional(
      Type.Object(
        {
          northOffsetSource: Type.Optional(Type.Union([Type.Literal('surveyed'), Type.Literal('unknown')])),
          kind: Type.Optional(
            Type.Union(
              [
                Type.Literal('absolute-encoder'),
                Type.Literal('incremental-encoder'),
                Type.Literal('proximity'),
              ],
              {
                description:
                  'what reads the nacelle position: raw words are decoded from nacelle_code, or counted from pulse_a and pulse_b; proximity: switches at the teeth of the yaw ring; default: told by what the log holds',
              },
            ),
          ),
          bits,
          code,
          pulsesPerTurn: Type.Optional(
            Type.Integer({
              minimum: 1,
              maximum: 1_000_000,
              description: 'pulses of track A per turn of the encoder, or teeth of the yaw ring',
            }),
          ),
          quadrature: Type.Optional(
            Type.Boolean({
              description:
                'true: tracks A and B stand a quarter pulse apart, every edge counts, four a pulse; false: B is the direction of the pulses of A; default true',
            }),
          ),
          index: Type.Optional(
            Type.Boolean({
              description:
                'whether pulse_z is an index, once a turn of the encoder, that checks the count; default true',
            }),
          ),
          gearRatio: Type.Optional(
            Type.Number({
              exclusiveMinimum: 0,
              maximum: 10_000,
              description: 'turns of the encoder per turn of the nacelle; default 1',
            }),
          ),
          twistLimitTurns: Type.Optional(
            Type.Number({
              exclusiveMinimum: 0,
              maximum: 20,
              description: 'turns to one side after which the controller untwists the cable',
            }),
          ),
          zeroDeg,
          direction,
        },
        { additionalProperties: false },
      ),
    ),
    ultrasonic: Type.Optional(
      Type.Object(
        {
          pathLengthM: Type.Number({
            exclusiveMinimum: 0,
            maximum: 5,
            description: 'between the transducers of a path, m; the same for all',
          }),
          directionsDeg: Type.Array(Type.Number({ minimum: -360, maximum: 360 }), {
            minItems: 2,
            maxItems: 3,
            description:
              'bearing that the forward pulse of each path travels to, clockwise from ahead of the nacelle: transit_1 and transit_2 are the first path forward and backward, and so on',
          }),
        },
        { additionalProperties: false },
      ),
    ),
    reference: Type.Optional(
      Type.Object(
        {
          kind: Type.Union(
            [Type.Literal('yawError'), Type.Literal('relativeDirection'), Type.Literal('absoluteDirection')],
            {
              description:
                'what the reference gives: the yaw error itself (reference_yaw_error), or reference_direction relative to the nacelle, or from north',
            },
          ),
          mountingDeg: Type.Optional(
            Type.Number({
              minimum: 0,
              maximum: 20,
              description: 'standard deviation of how well its own zero is known, degrees; default 0.5',
            }),
          ),
        },
        { additionalProperties: false },
      ),
    ),
    powerCurve: Type.Optional(
      Type.Array(
        Type.Object(
          { windSpeedMs: Type.Number({ minimum: 0, maximum: 60 }), powerKw: Type.Number() },
          { additionalProperties: false },
        ),
        {
          maxItems: 500,
          description: "the maker's curve at 1.225 kg/m3; shown for comparison, never used for the offset",
        },
      ),
    ),
  },
  { additionalProperties: false },
)
export type TurbineSetup = Static<typeof TurbineSetup>

/** What the wind of a year is judged by. */
export const LongTerm = Type.Object(
  {
    meanWindSpeedMs: Type.Number({
      exclusiveMinimum: 0,
      maximum: 30,
      description: 'mean of many years at hub height, on the scale of the nacelle anemometers',
    }),
    weibullShape: Type.Optional(
      Type.Number({
        minimum: 0.8,
        maximum: 10,
        description: 'without it the distribution of the window is brought to the long-term mean',
      }),
    ),
    source: Type.String({ minLength: 1, maxLength: 500, description: 'where the mean comes from' }),
  },
  {
    additionalProperties: false,
    description: 'without it a year ahead is told as a range over mean wind speeds',
  },
)
export type LongTerm = Static<typeof LongTerm>

const Price = (description: string) => Type.Number({ minimum: -100000, maximum: 100000, description })

/** What a megawatt hour is worth and a visit costs. */
export const SiteValue = Type.Object(
  {
    currency: Type.String({ minLength: 1, maxLength: 20, description: 'text that stands behind sums' }),
    pricePerMwh: Type.Optional(Price('one price')),
    monthlyPricesPerMwh: Type.Optional(
      Type.Array(Price('of a month'), {
        minItems: 12,
        maxItems: 12,
        description: 'January to December, by the clock of the site',
      }),
    ),
    hourlyPricesPerMwh: Type.Optional(
      Type.Array(Price('of an hour'), {
        minItems: 24,
        maxItems: 24,
        description: 'by hour of the day, 0 to 23, by the clock of the site',
      }),
    ),
    visitCost: Type.Optional(
      Type.Number({
        minimum: 0,
        maximum: 1e9,
        description: 'of one visit to a turbine, with what it does not produce meanwhile',
      }),
    ),
  },
  {
    additionalProperties: false,
    description: 'exactly one of the three kinds of price; without a price no money is shown',
  },
)
export type SiteValue = Static<typeof SiteValue>

/** The site file of the command line and of PUT /v1/sites: one document, one schema. */
export const SiteFile = Type.Object(
  {
    site: Type.Optional(Name),
    timezone: Type.Optional(
      Type.String({ minLength: 1, maxLength: 60, examples: ['Europe/Berlin'], description: 'IANA name' }),
    ),
    stamp: Type.Optional(
      Type.Union([Type.Literal('begin'), Type.Literal('end')], {
        description: 'which edge of its interval a time stamp marks',
      }),
    ),
    intervalS: Type.Optional(Type.Number({ exclusiveMinimum: 0, maximum: 3600 })),
    runningStatus: Type.Optional(
      Type.Array(Type.String(), {
        maxItems: 200,
        description: 'values of `status` in which the turbine runs normally',
      }),
    ),
    turbines: Type.Optional(Type.Array(TurbineSetup, { maxItems: 5000 })),
    longTerm: Type.Optional(LongTerm),
    value: Type.Optional(SiteValue),
    corrections: Type.Optional(
      Type.Array(
        Type.Object(
          {
            turbine: Name,
            at: IsoTime('when the correction was entered'),
            enteredDeg: Type.Number({ minimum: -180, maximum: 180 }),
            note: Type.Optional(Type.String({ maxLength: 2000 })),
          },
          { additionalProperties: false },
        ),
      ),
    ),
    events: Type.Optional(
      Type.Array(
        Type.Object(
          {
            turbine: Type.Optional(Name),
            at: IsoTime('when it happened'),
            kind: Type.String({ maxLength: 100 }),
            note: Type.Optional(Type.String({ maxLength: 2000 })),
          },
          { additionalProperties: false },
        ),
      ),
    ),
    exclude: Type.Optional(
      Type.Array(
        Type.Object(
          {
            turbine: Type.Optional(Name),
            from: IsoTime('first moment left out'),
            to: IsoTime('first moment taken again'),
            reason: Type.Optional(Type.String({ maxLength: 2000 })),
          },
          { additionalProperties: false },
        ),
      ),
    ),
  },
  { additionalProperties: false, description: 'Site file' },
)
export type SiteFile = Static<typeof SiteFile>
