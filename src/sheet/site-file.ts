import { Type, type Static } from 'typebox'
import { IsoTime } from './common.ts'

const Name = Type.String({ minLength: 1, maxLength: 100, pattern: '^[^\\u0000-\\u001f/]+$' })

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
        },
        { additionalProperties: false },
      ),
    ),
    nacelle: Type.Optional(
      Type.Object(
        {
          northOffsetSource: Type.Optional(Type.Union([Type.Literal('surveyed'), Type.Literal('unknown')])),
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
