import type { TurbineColumns } from '../../src/frame/index.ts'

const TEN_MINUTES = 600_000

/** A closed-form curve: steep at low speed, flat at rated, no kink; kW at 1.225 kg/m3. */
export function curveKw(speedMs: number, ratedKw = 2000): number {
  const cubed = (speedMs / 9) ** 3
  return (ratedKw * cubed) / (1 + cubed ** 2) ** 0.5
}

/** Rows of one turbine in quiet, changing wind; channels may be replaced or added. */
export function columnsOf(
  n: number,
  numbers: Record<string, Float64Array> = {},
  texts: Record<string, (string | null)[]> = {},
): TurbineColumns {
  const windSpeed = Float64Array.from({ length: n }, (_, i) => 7.5 + 3.5 * Math.sin(i / 40))
  return {
    turbine: 'T1',
    time: Float64Array.from({ length: n }, (_, i) => Date.parse('2026-01-01T00:00:00Z') + i * TEN_MINUTES),
    numbers: {
      wind_speed: windSpeed,
      vane: Float64Array.from({ length: n }, (_, i) => 4 * Math.sin(i * 1.7)),
      power: windSpeed.map((speed) => curveKw(speed)),
      ...numbers,
    },
    texts,
  }
}
