import { BINNED_NOT_A_TEST, type ScoreSheet } from '../../src/sheet/index.ts'

type Turbine = ScoreSheet['turbines'][number]

/** A score sheet as a replay of one small log could give it: made up, and whole by the schema. */
export function sheetExample(replay: string, turbines: Turbine[] = [turbineExample('Q01')]): ScoreSheet {
  return {
    replay,
    site: 'quern-hill',
    window: { from: '2026-03-01T00:00:00.000Z', to: '2026-04-01T00:00:00.000Z', intervalS: 600 },
    rows: { received: 4464, accepted: 4460, duplicate: 1, rejected: 3 },
    receipt: {
      received: 4464,
      accepted: 4460,
      duplicate: 1,
      rejected: 3,
      rejectedByReason: [{ reason: 'no-time', rows: 3, firstLine: 12, firstText: ',Q01,8.1' }],
      blankLines: 0,
      first: '2026-03-01T00:00:00.000Z',
      last: '2026-03-31T23:50:00.000Z',
      intervalS: 600,
      turbines: [{ turbine: 'Q01', rows: 4460 }],
      columns: [
        {
          column: 'Wspd',
          takenFor: 'wind_speed',
          unit: 'm/s',
          why: 'name',
          unreadable: 0,
          outOfRange: 0,
          missing: 2,
        },
      ],
      inputs: [{ name: 'log.csv', sha256: '0'.repeat(64), rows: 4464 }],
      warnings: [],
    },
    provenance: {
      version: '0.1.0',
      node: 'v24.0.0',
      settings: settingsExample(),
      reading: { timezone: 'UTC' },
      inputs: [{ name: 'log.csv', sha256: '0'.repeat(64), rows: 4464 }],
      seed: 1,
    },
    fleet: { anemometerResponsePerDeg: {} },
    turbines,
    worklist: [worklistExample()],
    corrections: [],
    warnings: ['no time zone is known: stamps are taken as UTC'],
  }
}

export function settingsExample(): ScoreSheet['provenance']['settings'] {
  return {
    exponent: 3,
    exponentLow: 1.4,
    exponentHigh: 3,
    actionThresholdDeg: 3,
    resamples: 1000,
    seed: 1,
    assumedResponsePctPerDeg: null,
    responseSpreadPctPerDeg: 0.15,
    windMinMs: 5,
    vaneMaxDeg: 15,
    yawMoveMaxDeg: 5,
    fastDirectionDeg: 10,
    fastSpeedMs: 2,
    minimumRows: 150,
    minimumDays: 5,
  }
}

export function turbineExample(turbine: string, standingDeg: number | null = 6.1): Turbine {
  const statistics = { meanDeg: 0.1, medianDeg: 0, circularSdDeg: 4.2, resultantLength: 0.997, rows: 2600 }
  return {
    turbine,
    model: null,
    ratedPowerKw: 2300,
    verdict: standingDeg === null ? 'undetermined' : 'offset',
    reason: standingDeg === null ? 'the interval is too wide' : 'stands off by 6.1 degrees',
    reasonCode: standingDeg === null ? 'INTERVAL_TOO_WIDE' : 'OFFSET',
    rows: {
      accepted: 4460,
      used: 2110,
      setAside: [{ reason: 'not-running', rows: 2350 }],
      averagedAcrossNorth: { vane: 0, nacelle_position: 0, wind_direction: 0 },
    },
    score: standingDeg === null ? null : 97.9,
    scoreAt10min: 'spread inside the interval is not in it',
    scoreWithinInterval: null,
    vane: statistics,
    yawError: {
      ...statistics,
      kappa: 190.5,
      skewness: 0,
      kurtosis: 0.1,
      meanInterval95Deg: [-0.1, 0.3],
      quantilesDeg: { p05: -7, p25: -3, p50: 0, p75: 3, p95: 7 },
      histogram: { binWidthDeg: 1, firstEdgeDeg: -2, counts: [1, 2, 2, 1] },
      byWindSpeed: [],
      byDirection: [],
      offsetUsedDeg: standingDeg,
      note: '',
    },
    staticOffset: {
      estimateDeg: standingDeg,
      interval95Deg: standingDeg === null ? [null, null] : [standingDeg - 1.3, standingDeg + 1.3],
      interval95GivenExponentDeg:
        standingDeg === null ? [null, null] : [standingDeg - 1.3, standingDeg + 1.2],
      standingMisalignmentDeg: standingDeg,
      standingInterval95Deg: standingDeg === null ? [null, null] : [standingDeg - 1.4, standingDeg + 1.4],
      standingInterval95GivenExponentDeg:
        standingDeg === null ? [null, null] : [standingDeg - 1.4, standingDeg + 1.2],
      intervalParts: { statistical: 0.9, response: 0.8, exponent: 0.5, instrument: null, dilution: 0.1 },
      method: 'power-slope',
      estimates: [],
      byExponent: [],
      changes: [],
      signChecked: false,
      vaneLogged: 'unknown',
      furtherDays: null,
      furtherNote: '',
      rows: 2110,
      days: 28,
      bins: [],
      fittedExponent: { exponent: 2.4, interval95: [1.9, 2.9], note: 'a diagnostic' },
      byCondition: { groups: [], sameness: [], windSpeedSlope: null, curve: null, note: '' },
      powerAgainstVane: { ...emptyGrid(), relativePowerMean: [], relativePowerSd: [] },
      captureMatrix: emptyGrid(),
      entry: {
        addToVaneDeg: null,
        vaneOffsetAfterDeg: null,
        turnMarkDeg: null,
        text: 'not known whether before or after',
        vaneGain: { assumed: 1, text: 'taken as 1', ifGain: [] },
      },
    },
    energyLoss: {
      exponent: 3,
      producedMwh: 510,
      hours: 743,
      windowHours: 744,
      gapHours: 1,
      gapsScaledBy: 1.0013,
      static: {
        windowMwh: 6.9,
        windowInterval95Mwh: [3.4, 10.2],
        recoverablePctOfProduced: 1.35,
        annualMwh: 81.2,
        annualInterval95Mwh: [40.1, 120.9],
        byMisalignment: [{ standingDeg: 6, windowMwh: 6.7, annualMwh: 79.1 }],
      },
      dynamic: { windowMwh: 1.9, annualMwh: 22.4 },
      yearAhead: {
        basis: 'range over mean wind speeds',
        meanWindSpeedMs: 7.1,
        windowMeanWindSpeedMs: 7.1,
        rangeMwh: [60.3, 95.8],
        rangeMeanWindSpeedMs: [5.7, 8.5],
        byMeanWindSpeed: [],
        note: '',
      },
      value: null,
      curveCheck: {
        label: BINNED_NOT_A_TEST,
        hours: 390,
        hoursNeeded: 180,
        minutesNeeded: 30,
        bins: 30,
        incompleteBins: [],
        complete: true,
        note: '',
      },
      suppliedCurve: null,
      band: [],
      rows: 3900,
      note: '',
    },
    outlook:
      standingDeg === null
        ? null
        : {
            shrunkStandingDeg: standingDeg * 0.9,
            shrunkInterval95Deg: [standingDeg * 0.9 - 1.3, standingDeg * 0.9 + 1.3],
            probabilityBeyondThreshold: 0.98,
            expectedAnnualMwh: 66.1,
            interval95Mwh: [33.1, 110.9],
          },
    powerCurve: [],
    sensors: [],
    sensorTests: [],
    attribution: { text: '', evidence: [], wouldSettle: [] },
    nacelle: {
      state: 'compared',
      northMinusVaneOffsetDeg: 41.2,
      interval95Deg: [40.6, 41.8],
      northOffsetDeg: 47.3,
      northInterval95Deg: [45.1, 49.5],
      pieces: [
        {
          from: '2026-03-01T00:00:00.000Z',
          to: '2026-04-01T00:00:00.000Z',
          northMinusVaneOffsetDeg: 41.2,
          interval95Deg: [40.6, 41.8],
        },
      ],
      absolute: null,
      resolutionDeg: null,
      note: 'against the consensus of the farm',
    },
    yawActivity: {},
    advice: standingDeg === null ? [] : ['add 6.1 degrees to the vane offset once its sign is checked'],
    cautions: ['whether the logged vane already contains a correction is not known'],
  }
}

function emptyGrid() {
  return {
    speedFromMs: 0,
    speedWidthMs: 1,
    speedBins: 0,
    vaneFromDeg: -1,
    vaneWidthDeg: 2,
    vaneBins: 0,
    rows: [],
  }
}

export function worklistExample(turbine = 'Q01'): ScoreSheet['worklist'][number] {
  return {
    turbine,
    turbines: [turbine],
    kind: 'offset',
    standingMisalignmentDeg: 6.1,
    standingInterval95Deg: [4.7, 7.5],
    shrunkStandingDeg: 5.5,
    probabilityBeyondThreshold: 0.98,
    addToVaneDeg: null,
    firstStepDeg: null,
    parameter: null,
    whatToDo: 'Check the sign of the vane.',
    expectedAnnualMwh: 81.2,
    interval95Mwh: [40.1, 120.9],
    value: null,
    why: 'stands off by 6.1 degrees',
    reasons: ['from 2110 rows on 28 days'],
    findings: [],
    checkFirst: 'the sign of the vane',
    deskChecks: ['the sign of the vane'],
    watchAfter: ['the heading after a day or two'],
    firmUp: ['a reference instrument'],
    record: { asFoundDeg: null, asLeftDeg: null, changedAt: null, by: null, note: null },
    cautions: [],
  }
}
