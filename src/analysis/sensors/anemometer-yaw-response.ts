import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineResponse } from '../neighbours/anemometer-response.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'

const TEST = 'response to yaw, against neighbours'
const NORMAL_95 = 1.959963984540054
/** A response of less shifts no offset by a degree, per degree of vane. */
const LEAST_PER_DEG = 0.0003

/** Says how the anemometer answers to yaw where neighbours tell it: known, and taken out of the static offset. */
export function anemometerYawResponse(frame: TurbineFrame, response: TurbineResponse | null): SensorReport {
  if (!response)
    return notTested('anemometer', TEST, 'needs neighbours that run in free stream at the same time')
  const { perDeg, sdPerDeg, rows } = response
  const half = NORMAL_95 * sdPerDeg
  const note = `${rows} rows beside neighbours: ${(100 * perDeg).toFixed(2)} +- ${(100 * half).toFixed(2)} % per degree`
  if (!(Math.abs(perDeg) >= LEAST_PER_DEG && Math.abs(perDeg) > half)) return tested('anemometer', TEST, note)
  return tested('anemometer', TEST, note, [
    {
      sensor: 'anemometer',
      kind: 'yaw-response',
      finding: `the anemometer reads ${(100 * Math.abs(perDeg)).toFixed(2)} % ${perDeg < 0 ? 'less' : 'more'} for each degree that the wind comes from clockwise of the axis (+- ${(100 * half).toFixed(2)} %)`,
      severity: 'info',
      howSure: 'likely',
      checkFirst:
        'At the desk: nothing to mend. A whole model alike points to the flow about the nacelle; a single turbine to the mount of its anemometer.',
      from: new Date(frame.time[0]!).toISOString(),
      to: null,
      detail: {
        perDeg,
        interval95PerDeg: [perDeg - half, perDeg + half],
        ownPerDeg: response.ownPerDeg,
        spoils: 'static offset from own wind speed, which is corrected for it and carries its error',
      },
    },
  ])
}
