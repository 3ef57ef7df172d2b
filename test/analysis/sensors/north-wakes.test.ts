import { expect, test } from 'vitest'
import { dayBlocks, northByWakes } from '../../../src/analysis/index.ts'
import { buildFrame, type Frame } from '../../../src/frame/index.ts'
import { SETTINGS } from '../../frame/settings.ts'
import { normals } from '../../kernel/stats/normals.ts'

const DIAMETER_M = 100
const DAYS = 40
const ROWS = DAYS * 144
const FIRST_MS = Date.parse('2026-01-01T00:00:00Z')
/** East and north in rotor diameters: bearings of the pairs differ, so that no other turn fits as well. */
const PLACES = [
  [0, 0],
  [5, 1],
  [2, 6],
  [8, 7],
] as const

/** Turbines behind each other lose 40 % of their power within about 8 degrees of the bearing, by a trough that is not the pattern's own. */
function wakedFarm(withLayout: boolean, wakes = true): { frame: Frame; direction: Float64Array } {
  const weather = normals(3)
  const direction = new Float64Array(ROWS)
  let turn = 0
  for (let i = 0; i < ROWS; i++) direction[i] = (((turn += 3 * weather()) % 360) + 360) % 360
  const columns = PLACES.map(([east, north], k) => {
    const draw = normals(50 + k)
    const power = direction.map((from) => {
      let lost = 0
      PLACES.forEach(([otherEast, otherNorth], j) => {
        if (j === k || !wakes) return
        const bearing = (Math.atan2(otherEast - east, otherNorth - north) * 180) / Math.PI
        const off = ((((from - bearing) % 360) + 540) % 360) - 180
        lost += 0.5 * Math.max(0, 1 - Math.abs(off) / 12)
      })
      return 1000 * Math.exp(-lost + 0.1 * draw())
    })
    return {
      turbine: `T${k + 1}`,
      time: Float64Array.from({ length: ROWS }, (_, i) => FIRST_MS + i * 600_000),
      numbers: {
        wind_speed: new Float64Array(ROWS).fill(8),
        vane: new Float64Array(ROWS).map(() => 3 * draw()),
        power,
        nacelle_position: direction,
      },
      texts: {},
    }
  })
  const frame = buildFrame(columns, {
    settings: SETTINGS,
    intervalS: 600,
    site: {
      turbines: columns.map(({ turbine }, k) => ({
        turbine,
        ratedPowerKw: 2000,
        ...(withLayout && {
          rotorDiameterM: DIAMETER_M,
          eastingM: PLACES[k]![0] * DIAMETER_M,
          northingM: PLACES[k]![1] * DIAMETER_M,
        }),
      })),
    },
  })
  return { frame, direction }
}

test('a consensus that is turned against true north is turned back by the wakes', () => {
  const { frame, direction } = wakedFarm(true)
  const weights = dayBlocks(frame.calendar.days, SETTINGS)
  for (const turned of [0, 37.3, -140]) {
    const consensus = direction.map((from) => (((from + turned) % 360) + 360) % 360)
    const north = northByWakes(frame, consensus, weights)!
    // A trough of 12 degrees on either side, some 100 rows in it for each pair, noise of 14 % in the ratio: some tenths.
    expect(Math.abs(north.shiftDeg - turned), `turned by ${turned}`).toBeLessThan(1)
    expect(Math.abs(north.shiftDeg - turned)).toBeLessThan(north.halfWidthDeg)
    expect(north.halfWidthDeg).toBeGreaterThan(1)
    expect(north.halfWidthDeg).toBeLessThan(2.5)
    expect(north.pairs).toBe(6)
  }
})

test('without a layout, or without wakes, nothing is said', () => {
  const unknown = wakedFarm(false)
  const weights = dayBlocks(unknown.frame.calendar.days, SETTINGS)
  expect(northByWakes(unknown.frame, unknown.direction, weights)).toBeNull()
  const calm = wakedFarm(true, false)
  expect(northByWakes(calm.frame, calm.direction, weights)).toBeNull()
})
