import { Type, type Static } from 'typebox'
import { Interval, Nullable } from './common.ts'
import { SensorFinding } from './findings.ts'

/** What is expected of a turbine once its estimate is seen among the others of its farm. */
export const Outlook = Type.Object(
  {
    shrunkStandingDeg: Nullable(
      'm drawn towards the rest of the farm as far as its error asks for: the largest estimate is also the luckiest',
    ),
    shrunkInterval95Deg: Interval('of it, were the exponent known'),
    probabilityBeyondThreshold: Nullable('that |m| exceeds the action threshold, 0 to 1'),
    expectedAnnualMwh: Nullable('static loss of a year at the shrunk m'),
    interval95Mwh: Interval('of it; lower end 0 when the interval of m spans 0'),
  },
  { description: 'null without an estimate' },
)
export type Outlook = Static<typeof Outlook>

/** Money of a visit; nothing of it is shown without a price. */
export const VisitValue = Type.Object(
  {
    currency: Type.String(),
    pricePerMwh: Nullable('that the year is valued at'),
    annual: Nullable('expected worth of the gain of a year'),
    annualInterval95: Interval('of it'),
    visitCost: Nullable('null: not given'),
    firstYearNet: Nullable('annual less the visit'),
    firstYearNetInterval95: Interval('of it'),
    paybackMonths: Nullable('months until the gain has paid the visit; null: never, or no cost given'),
    paybackInterval95Months: Interval('of it; an end that is null: never'),
  },
  { description: 'null without a price in the site file' },
)
export type VisitValue = Static<typeof VisitValue>

export const WorklistEntry = Type.Object({
  turbine: Type.String({ description: 'the turbine; of a shared entry what its turbines have in common' }),
  turbines: Type.Array(Type.String(), { description: 'all that the entry is about; one but for `shared`' }),
  kind: Type.Union([Type.Literal('offset'), Type.Literal('sensor'), Type.Literal('shared')], {
    description:
      'offset: it stands off the wind; sensor: a faulty sensor, and no number to enter; shared: many are off alike, which asks for one measurement and not for many climbs',
  }),
  standingMisalignmentDeg: Nullable('m, as estimated'),
  standingInterval95Deg: Interval('of it'),
  shrunkStandingDeg: Nullable('m, corrected for the luck of the largest'),
  probabilityBeyondThreshold: Nullable('that |m| exceeds the action threshold, 0 to 1'),
  addToVaneDeg: Nullable('degrees to enter; null until sign and vaneLogged are known'),
  firstStepDeg: Nullable('half of it, at most 5 degrees: the most to change at once'),
  parameter: Type.Union([
    Type.Object(
      {
        name: Type.String(),
        currentDeg: Type.Number({ description: 'by the site file' }),
        afterFirstStepDeg: Type.Number(),
        newDeg: Type.Number(),
      },
      { description: 'vane offset of the controller' },
    ),
    Type.Null(),
  ]),
  whatToDo: Type.String({ description: 'the change in words, at the controller and at the vane' }),
  expectedAnnualMwh: Nullable('expected gain of a year, from the shrunk m'),
  interval95Mwh: Interval('of it'),
  value: Type.Union([VisitValue, Type.Null()]),
  why: Type.String(),
  reasons: Type.Array(Type.String({ description: 'why we believe it, and what speaks against it' })),
  findings: Type.Array(SensorFinding, { description: 'to be looked at on the same visit' }),
  checkFirst: Type.String({ description: 'the most important check before a climb' }),
  deskChecks: Type.Array(Type.String({ description: 'before anybody climbs' })),
  watchAfter: Type.Array(Type.String({ description: 'after the change' })),
  firmUp: Type.Array(Type.String({ description: 'data that would make it surer' })),
  record: Type.Object(
    {
      asFoundDeg: Type.Null(),
      asLeftDeg: Type.Null(),
      changedAt: Type.Null(),
      by: Type.Null(),
      note: Type.Null(),
    },
    { description: 'blank fields, for whoever makes the change' },
  ),
  cautions: Type.Array(Type.String()),
})
export type WorklistEntry = Static<typeof WorklistEntry>

/** A turbine that is not on the list, and not aligned either. */
export const Unsettled = Type.Object({
  turbine: Type.String(),
  reason: Type.String(),
  probabilityBeyondThreshold: Nullable('that |m| exceeds the action threshold, 0 to 1'),
  expectedAnnualMwh: Nullable('at stake: static loss of a year at the shrunk m'),
})
export type Unsettled = Static<typeof Unsettled>
