import { expect, test } from 'vitest'
import { decodingPlan, RawWordDecoder } from '../../src/frame/index.ts'
import { grayFromBinary } from '../../src/kernel/decode/index.ts'
import type { TurbineSetup } from '../../src/sheet/index.ts'
import { gapDeg } from '../kernel/angle/gap-deg.ts'

const timesOf = (n: number): Float64Array => Float64Array.from({ length: n }, (_, i) => 1000 * i)

function decoderFor(setup: Omit<TurbineSetup, 'turbine'>, columns: readonly string[]): RawWordDecoder {
  const whole = { turbine: 'Q01', ...setup }
  return new RawWordDecoder(whole, decodingPlan(whole, columns))
}

test('what the site file lacks is named, sensor by sensor', () => {
  const columns = ['vane_ratio', 'nacelle_code', 'pulse_a', 'transit_1', 'transit_2']
  const plan = decodingPlan({ turbine: 'Q01' }, columns)
  expect(plan.makes).toEqual([])
  expect(plan.missing).toEqual([
    expect.stringContaining('vane.deadBandDeg'),
    expect.stringContaining('ultrasonic.pathLengthM'),
    expect.stringContaining('nacelle.bits'),
  ])
  expect(decodingPlan({ turbine: 'Q01' }, ['pulse_a']).missing).toEqual([expect.stringContaining('pulse_b')])
  const ultrasonic = { pathLengthM: 0.2, directionsDeg: [0, 120, 240] }
  expect(decodingPlan({ turbine: 'Q01', ultrasonic }, columns).missing[1]).toContain(
    'transit_3, transit_4, transit_5, transit_6',
  )
})

test('the kind of vane chooses between words where a log holds several', () => {
  const columns = ['vane_code', 'vane_ratio']
  const vane = { bits: 8, deadBandDeg: 5 }
  expect(decodingPlan({ turbine: 'Q01', vane }, columns).reads).toEqual(['vane_code'])
  const potentiometer = { ...vane, kind: 'potentiometer' as const }
  expect(decodingPlan({ turbine: 'Q01', vane: potentiometer }, columns).reads).toEqual(['vane_ratio'])
})

test('a geared encoder is followed over its turns, from stretch to stretch', () => {
  // 8 bits, five turns of the disc for one of the nacelle: a code is 360 / 256 / 5 = 0.28125 degrees. By hand.
  const decoder = decoderFor({ nacelle: { bits: 8, gearRatio: 5, direction: -1, zeroDeg: 90 } }, [
    'nacelle_code',
  ])
  const codes = Array.from({ length: 300 }, (_, i) => (240 + 4 * i) % 256)
  const words = Float64Array.from(codes, grayFromBinary)
  words[7] = NaN
  const positions = [words.slice(0, 150), words.slice(150)].flatMap((part) => [
    ...decoder.add(timesOf(part.length), { nacelle_code: part }).nacelle_position!,
  ])
  positions.forEach((position, i) => {
    if (i === 7) expect(position).toBeNaN()
    else expect(position, `row ${i}`).toBeCloseTo(90 - 0.28125 * (240 + 4 * i), 9)
  })
})

test('words that the sensor does not have are counted by channel', () => {
  const decoder = decoderFor({ vane: { bits: 4 } }, ['vane_code'])
  decoder.add(timesOf(3), { vane_code: Float64Array.of(3, 16, NaN) })
  const { vane } = decoder.add(timesOf(2), { vane_code: Float64Array.of(17, 1) })
  expect([...vane!]).toEqual([NaN, 22.5])
  expect(decoder.account).toEqual({ invalid: { vane_code: 2 }, pulses: null })
})

test('an ultrasonic sensor gives wind speed, vane and temperature from microseconds', () => {
  // Wind of 10 m/s from straight ahead, c = 340: along the path that points ahead it blows against the pulse.
  const [against, along] = [606.0606061, 571.4285714]
  const across = 0.2e6 / Math.sqrt(340 ** 2 - 10 ** 2)
  const decoder = decoderFor({ ultrasonic: { pathLengthM: 0.2, directionsDeg: [0, 90] } }, [
    'transit_1',
    'transit_2',
    'transit_3',
    'transit_4',
  ])
  const made = decoder.add(timesOf(1), {
    transit_1: Float64Array.of(against),
    transit_2: Float64Array.of(along),
    transit_3: Float64Array.of(across),
    transit_4: Float64Array.of(across),
  })
  expect(made.wind_speed![0]).toBeCloseTo(10, 6)
  expect(gapDeg(made.vane![0]!, 0)).toBeLessThan(1e-6)
  expect(made.air_temperature![0]).toBeCloseTo(340 ** 2 / 403 - 273.15, 5)
})
