import { expect, test } from 'vitest'
import { normals } from '../../kernel/stats/normals.ts'
import { comparedFarm, syntheticFarm, TURBINES } from './synthetic-farm.ts'

const truthOf = (i: number): number => -0.003 + 0.0004 * (i - (TURBINES - 1) / 2)

/**
 * What one turbine's own comparison leaves open: noise of a row over the vane's 4.5 degrees rms and the root of the rows. At 2 %
 * and about 2500 rows that is 9e-5 per degree; the neighbours' noise adds a tenth.
 */
const OWN_SD = 1e-4

test('neighbours tell what each anemometer answers to its vane, and the intervals hold it', () => {
  const { response } = comparedFarm(syntheticFarm({ response: (i, vane) => truthOf(i) * vane }))!
  response.turbines.forEach((turbine, i) => {
    expect(Math.abs(turbine!.ownPerDeg - truthOf(i)), `T${i + 1}`).toBeLessThan(4 * OWN_SD)
    expect(turbine!.ownSdPerDeg).toBeGreaterThan(0.5 * OWN_SD)
    expect(turbine!.ownSdPerDeg).toBeLessThan(2 * OWN_SD)
    expect(Math.abs(turbine!.perDeg - truthOf(i)), `T${i + 1}`).toBeLessThan(3 * turbine!.sdPerDeg)
  })
  // Six values 0.0004 apart have a sample SD of 7.5e-4.
  expect(response.models[0]!.spreadPerDeg).toBeGreaterThan(5e-4)
  expect(response.models[0]!.perDeg).toBeCloseTo(-0.003, 3)
})

test('where local gusts veer, the local direction is taken out of the comparison', () => {
  // 0.5 % per degree of local direction, a fifth of the variance of the vane: without care 0.1 % per degree too much.
  const linked = syntheticFarm({ response: (_, vane) => -0.003 * vane, linkPerDeg: 0.005 })
  const { response } = comparedFarm(linked)!
  expect(response.linkShare).toBeGreaterThan(0.9)
  expect(response.linkPerDeg).toBeCloseTo(-0.001, 3)
  expect(Math.abs(response.models[0]!.perDeg + 0.003)).toBeLessThan(2e-4)
})

test('without nacelle positions there is no direction of the farm, and nothing is compared', () => {
  expect(
    comparedFarm(syntheticFarm({ response: (_, vane) => -0.003 * vane, withPosition: false })),
  ).toBeNull()
})

test('a turbine that stands in a wake is not compared there', () => {
  const waked = (i: number, direction: number): number =>
    i === 0 && direction > 90 && direction < 120 ? -0.2 * (1 + (direction - 105) / 30) : 0
  const free = comparedFarm(syntheticFarm({ response: (_, vane) => -0.003 * vane }))!
  const { response } = comparedFarm(syntheticFarm({ response: (_, vane) => -0.003 * vane, wake: waked }))!
  // 30 of 360 degrees, and 5 on either side.
  const share = response.turbines[0]!.rows / free.response.turbines[0]!.rows
  expect(share).toBeLessThan(1 - 30 / 360)
  expect(share).toBeGreaterThan(1 - 60 / 360)
  expect(response.turbines[1]!.rows).toBe(free.response.turbines[1]!.rows)
  expect(Math.abs(response.turbines[0]!.ownPerDeg + 0.003)).toBeLessThan(4 * OWN_SD)
})

test('quiet intervals count for more: noise of a third of the rows hardly matters when its size is known', () => {
  const frame = syntheticFarm({ response: (_, vane) => -0.003 * vane, localSd: 0.01 })
  const draw = normals(5)
  const shaken = {
    ...frame,
    turbines: frame.turbines.map((turbine) => ({
      ...turbine,
      turbulence: turbine.time.map((_, t) => (t % 3 === 0 ? 0.2 : 0.05)),
      normalisedSpeed: turbine.normalisedSpeed.map((speed, t) =>
        t % 3 === 0 ? speed * Math.exp(0.1 * draw()) : speed,
      ),
    })),
  }
  const blind = {
    ...shaken,
    turbines: shaken.turbines.map((turbine) => ({ ...turbine, turbulence: turbine.time.map(() => NaN) })),
  }
  const sdOf = (one: typeof frame): number => comparedFarm(one)!.response.turbines[0]!.ownSdPerDeg
  expect(sdOf(shaken)).toBeLessThan(0.8 * sdOf(blind))
})

test('a response that changes with wind speed is told, and so is one that is not odd in the vane', () => {
  const plain = comparedFarm(syntheticFarm({ response: (_, vane) => -0.003 * vane }))!.shapes[0]!
  expect(plain.withSpeed.beyondChance).toBe(false)
  expect(plain.square.beyondChance).toBe(false)
  expect(plain.withSpeed.sd).toBeGreaterThan(0)

  const perLog = 0.002
  const faster = comparedFarm(
    syntheticFarm({ response: (_, vane, speed) => (-0.003 + perLog * Math.log(speed / 8)) * vane }),
  )!.shapes[0]!
  expect(faster.withSpeed.beyondChance).toBe(true)
  const change = perLog * Math.log(10 / 6)
  expect(Math.abs(faster.withSpeed.size - change)).toBeLessThan(4 * faster.withSpeed.sd)

  const bent = comparedFarm(syntheticFarm({ response: (_, vane) => -0.003 * vane - 1.5e-4 * vane ** 2 }))!
    .shapes[0]!
  expect(bent.square.beyondChance).toBe(true)
  expect(Math.abs(bent.square.size + 1.5e-4)).toBeLessThan(4 * bent.square.sd)
})
