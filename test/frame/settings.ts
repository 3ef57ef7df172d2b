import type { ScoringSettings } from '../../src/sheet/index.ts'

/** The defaults of the service, written out, so that a test says what it stands on. */
export const SETTINGS: ScoringSettings = {
  exponent: 3,
  exponentLow: 1.4,
  exponentHigh: 3,
  actionThresholdDeg: 3,
  resamples: 400,
  seed: 1,
  assumedResponsePctPerDeg: null,
  responseSpreadPctPerDeg: 0.15,
  windMinMs: 4.5,
  vaneMaxDeg: 15,
  yawMoveMaxDeg: 5,
  fastDirectionDeg: 10,
  fastSpeedMs: 2,
  minimumRows: 150,
  minimumDays: 5,
}
