import type { FarmScenario } from './scenario.ts'

/** The month of data-demo/: eight turbines with honest anemometers, three vanes that are off, and a log with a few blemishes. */
export const DEMO_SCENARIO: Partial<FarmScenario> = {
  seed: 20260301,
  turbines: 8,
  days: 31,
  startMs: Date.UTC(2026, 2, 1),
  offsetsDeg: [0.4, -1.1, 0.8, 6.1, -0.3, -7.4, 1.6, 3.9],
  // 12 March, 09:00 to 15:30 UTC: the second turbine is held at 900 kW.
  limits: [{ turbine: 1, fromS: 11.375 * 86400, toS: 11.375 * 86400 + 6.5 * 3600, limitKw: 900 }],
  missingCells: 0.0004,
  brokenLines: 2,
}
