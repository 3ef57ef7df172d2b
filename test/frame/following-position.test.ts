import { expect, test } from 'vitest'
import { buildFrame, type TurbineColumns } from '../../src/frame/index.ts'
import { normals } from '../kernel/stats/normals.ts'
import { columnsOf } from './columns.ts'
import { SETTINGS } from './settings.ts'

const N = 1440

function frameOf(columns: TurbineColumns) {
  return buildFrame([columns], { site: {}, settings: SETTINGS, intervalS: 600 }).turbines[0]!
}

test('a nacelle position that is noise changes no row of vane and power, and is told', () => {
  const draw = normals(3)
  const noise = Float64Array.from({ length: N }, () => (((180 + 400 * draw()) % 360) + 360) % 360)
  const without = frameOf(columnsOf(N))
  const noisy = frameOf(
    columnsOf(N, { nacelle_position: noise, nacelle_position_min: noise, nacelle_position_max: noise }),
  )
  for (const channel of ['vane', 'reason', 'running', 'limited', 'normalisedSpeed'] as const) {
    expect(noisy[channel], channel).toEqual(without[channel])
  }
  expect(noisy.averagedAcrossNorth.nacelle_position).toBe(0)
  expect(noisy.nacellePosition).toEqual(noise)
  expect(noisy.indicatedDirection.every(Number.isNaN)).toBe(true)
  expect(noisy.notes).toContainEqual(expect.stringContaining('nacelle_position jumps about'))
})

test('a nacelle that turns with the wind, through north and by a large move a day, is followed', () => {
  const heading = Float64Array.from(
    { length: N },
    (_, i) => (350 + Math.floor(i / 3) * 4 + Math.floor(i / 144) * 90) % 360,
  )
  const frame = frameOf(columnsOf(N, { nacelle_position: heading }))
  expect(frame.notes).not.toContainEqual(expect.stringContaining('jumps about'))
  expect(frame.indicatedDirection.some((direction) => direction >= 0)).toBe(true)
})

test('one that lost its zero after every stop is still followed', () => {
  const draw = normals(5)
  let zero = 0
  const heading = Float64Array.from({ length: N }, (_, i) => {
    if (i % 20 === 0) zero = 100 * draw()
    return 500 + zero
  })
  const frame = frameOf(columnsOf(N, { nacelle_position: heading }))
  expect(frame.notes).not.toContainEqual(expect.stringContaining('jumps about'))
})
