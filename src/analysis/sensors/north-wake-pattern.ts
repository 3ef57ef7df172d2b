import { RAD_PER_DEG } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'

/** Growth of a wake's width with distance, and its width at the rotor in diameters; thrust below rated. */
const GROWTH = 0.04
const WIDTH_AT_ROTOR = 0.25
const THRUST = 0.8
/** Wakes are looked at so far downstream, rotor diameters. */
const NEAREST_D = 1
const FURTHEST_D = 30
/** Power below rated goes with the cube of the wind speed. */
const POWER_EXPONENT = 3

export interface Place {
  readonly eastM: number
  readonly northM: number
  readonly diameterM: number
}

/** Where the turbines of a farm stand; null unless place and rotor of all are known and two differ. */
export function layoutOf(turbines: readonly TurbineFrame[]): Place[] | null {
  const places = turbines.map(({ setup }) => ({
    eastM: setup.eastingM ?? NaN,
    northM: setup.northingM ?? NaN,
    diameterM: setup.rotorDiameterM ?? NaN,
  }))
  if (places.some(({ eastM, northM, diameterM }) => Number.isNaN(eastM + northM + diameterM))) return null
  const [first] = places
  return places.some(({ eastM, northM }) => eastM !== first!.eastM || northM !== first!.northM)
    ? places
    : null
}

/**
 * ln of the share of its power that each turbine keeps in the wakes of the others, by true wind direction: entry [i][b] for
 * b + 1/2 degrees. Deficits combine as the root of the sum of their squares.
 *
 * @source Bastankhah & Porte-Agel (2014), A new analytical model for wind-turbine wakes, Renewable Energy 70, 116-123: a
 *   Gaussian wake whose width grows linearly.
 */
export function wakeLosses(layout: readonly Place[]): Float64Array[] {
  return layout.map((own) =>
    Float64Array.from({ length: 360 }, (_, b) => {
      const from = (b + 0.5) * RAD_PER_DEG
      let squares = 0
      for (const other of layout) {
        if (other === own) continue
        const east = own.eastM - other.eastM
        const north = own.northM - other.northM
        const along = -(east * Math.sin(from) + north * Math.cos(from)) / other.diameterM
        if (!(along > NEAREST_D && along < FURTHEST_D)) continue
        const across = (east * Math.cos(from) - north * Math.sin(from)) / other.diameterM
        squares += deficit(along, across) ** 2
      }
      return POWER_EXPONENT * Math.log(1 - Math.min(0.6, Math.sqrt(squares)))
    }),
  )
}

/** Distances in rotor diameters. */
function deficit(along: number, across: number): number {
  const width = GROWTH * along + WIDTH_AT_ROTOR
  const root = 1 - THRUST / (8 * width * width)
  const depth = 1 - Math.sqrt(Math.max(0, root))
  return depth * Math.exp(-(across * across) / (2 * width * width))
}
