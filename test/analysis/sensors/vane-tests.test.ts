import { beforeAll, expect, test } from 'vitest'
import { vaneAndAnemometer } from '../../../src/analysis/index.ts'
import { buildFrame, type Frame, type TurbineColumns } from '../../../src/frame/index.ts'
import { simulateFarm } from '../../../src/simulate/index.ts'
import type { SensorFinding } from '../../../src/sheet/index.ts'
import { normals } from '../../kernel/stats/normals.ts'
import { SETTINGS } from '../../frame/settings.ts'

type Numbers = Record<string, Float64Array>

const DAYS = 24
const CHANGED_ROW = 14 * 144
let farm: TurbineColumns[]
beforeAll(() => {
  farm = simulateFarm({ seed: 3, turbines: 4, days: DAYS, secondVaneOffsetDeg: 1 }).turbines.map((one) => ({
    turbine: one.turbine,
    time: one.timeMs,
    numbers: { ...one.columns },
    texts: { status: one.status },
  }))
})

function frameOf(columns: readonly TurbineColumns[]): Frame {
  return buildFrame(columns, {
    site: { runningStatus: ['run', 'limited'] },
    settings: SETTINGS,
    intervalS: 600,
    ratedPowerKw: 2300,
  })
}

/** What is found at the first turbine, with some of its channels replaced; the others stay healthy. */
function findings(change: (numbers: Numbers) => Numbers, columns = farm): readonly SensorFinding[] {
  const changed = columns.map((one, i) =>
    i === 0 ? { ...one, numbers: { ...one.numbers, ...change({ ...one.numbers }) } } : one,
  )
  const reports = vaneAndAnemometer(frameOf(changed), SETTINGS)
  for (const { findings: others } of reports.slice(1)) {
    expect(others.filter(({ severity }) => severity !== 'info')).toEqual([])
  }
  return reports[0]!.findings
}

const later = (values: Float64Array, change: (value: number, i: number) => number): Float64Array =>
  values.map((value, i) => (i >= CHANGED_ROW ? change(value, i) : value))

test('nothing is found at healthy vanes, and the tests say what they lacked', () => {
  expect(findings((numbers) => numbers)).toEqual([])
  const { tests } = vaneAndAnemometer(frameOf(farm), SETTINGS)[0]!
  const isDone = (name: string) => tests.find((one) => one.test.startsWith(name))
  expect(isDone('two vanes')?.done).toBe(true)
  expect(isDone('noise floor')?.done).toBe(true)
  expect(isDone('stuck bit')).toMatchObject({ done: false })
  expect(isDone('stuck bit')!.note).toMatch(/high-rate/)
})

test.each([1.4, 0.7])('a vane that scatters %f times as much from a day on is dated to a day', (factor) => {
  const found = findings(({ vane_sd }) => ({ vane_sd: later(vane_sd!, (value) => factor * value) }))
  expect(found.map(({ kind, severity }) => [kind, severity])).toEqual([['noise-changed', 'warn']])
  const at = Date.parse(found[0]!.detail['at'] as string)
  expect(Math.abs(at - farm[0]!.time[CHANGED_ROW]!)).toBeLessThanOrEqual(86_400_000)
  expect(Math.abs(Math.log((found[0]!.detail['factor'] as number) / factor))).toBeLessThan(0.1)
})

test('two vanes that drift apart by two degrees are found; which of them moved is left open', () => {
  const found = findings(({ vane_2 }) => ({ vane_2: later(vane_2!, (value) => value - 2) }))
  expect(found.map(({ kind, severity }) => [kind, severity])).toEqual([['two-vanes-apart', 'warn']])
  expect(Math.abs((found[0]!.detail['movedDeg'] as number) + 2)).toBeLessThan(0.4)
})

test('spikes are found by the extremes of their intervals', () => {
  const found = findings(({ vane, vane_sd }) => ({
    vane_min: vane!.map((value, i) => value - 3.3 * vane_sd![i]!),
    vane_max: vane!.map((value, i) =>
      // One second in 600 at 110 degrees, in 30 of the intervals.
      i % 113 === 7 ? 110 : value + 3.3 * vane_sd![i]!,
    ),
  }))
  expect(found.map(({ kind }) => kind)).toContain('spikes')
})

test('a resolution that halves twice is dated, and a coarse one is told', () => {
  const extremes = (numbers: Numbers, stepOf: (i: number) => number): Numbers => {
    const at = (sign: number) =>
      numbers['vane']!.map((value, i) => {
        const step = stepOf(i)
        return Math.round(100 * step * Math.round((value + sign * 3 * numbers['vane_sd']![i]!) / step)) / 100
      })
    return { vane_min: at(-1), vane_max: at(1) }
  }
  const coarsened = findings((numbers) => extremes(numbers, (i) => (i >= CHANGED_ROW ? 360 / 64 : 360 / 256)))
  const found = coarsened.filter(({ kind }) => kind === 'coarse-step')
  expect(found.map(({ severity }) => severity)).toEqual(['warn'])
  expect(found[0]!.from!.slice(0, 10)).toBe(new Date(farm[0]!.time[CHANGED_ROW]!).toISOString().slice(0, 10))
  const always = findings((numbers) => extremes(numbers, () => 360 / 256))
  expect(always.map(({ kind, severity }) => [kind, severity])).toEqual([['coarse-step', 'info']])
  expect(always[0]!.detail['bits']).toBe(8)
})

test('a stuck bit is named, of a binary word and of a Gray word', () => {
  const bits = 8
  const step = 360 / 2 ** bits
  const draw = normals(4)
  const coded = (numbers: Numbers, stick: (code: number) => number): Numbers => {
    const at = (sign: number) =>
      numbers['vane']!.map((value) => {
        const angle = value + sign * (12 + 3 * draw())
        const code = (Math.round(angle / step) + 4 * 2 ** bits) % 2 ** bits
        const read = step * stick(code)
        return Math.round(100 * (read >= 180 ? read - 360 : read)) / 100
      })
    const [low, high] = [at(-1), at(1)]
    return { vane_min: low, vane_max: high.map((value, i) => Math.max(value, low[i]!)) }
  }
  const binary = findings((numbers) => coded(numbers, (code) => code & ~(1 << 1)))
  expect(binary.find(({ kind }) => kind === 'stuck-bit')?.detail).toMatchObject({ binaryBit: 1, bits: 8 })
  // Bit 0 of the Gray word forced to 0, then back to binary.
  const gray = (code: number): number => {
    let word = (code ^ (code >> 1)) & ~1
    let out = 0
    for (; word > 0; word >>= 1) out ^= word
    return out
  }
  const found = findings((numbers) => coded(numbers, gray)).find(({ kind }) => kind === 'stuck-bit')
  expect(found?.detail).toMatchObject({ grayBit: 0 })
  expect(findings((numbers) => coded(numbers, (code) => code)).map(({ kind }) => kind)).not.toContain(
    'stuck-bit',
  )
})

test('a dead sector ahead is found from the angles that are never read', () => {
  const draw = normals(9)
  const wide = ({ vane }: Numbers): Float64Array => vane!.map((value) => value + 15 * draw())
  const found = findings((numbers) => ({
    vane: wide(numbers).map((value) => (value > 8 && value < 20 ? (value < 14 ? 8 : 20) : value)),
  }))
  const dead = found.filter(({ kind }) => kind === 'dead-sector')
  expect(dead).toHaveLength(1)
  expect(dead[0]!.detail).toMatchObject({ fromDeg: 10, toDeg: 20 }) // bins of two degrees: 8 to 10 holds the 8
  expect(findings((numbers) => ({ vane: wide(numbers) })).map(({ kind }) => kind)).not.toContain(
    'dead-sector',
  )
})

test('no finding about a vane changes when the nacelle position is noise', () => {
  const faulty = farm.map((one, i): TurbineColumns => ({
    ...one,
    numbers: {
      ...one.numbers,
      vane_sd: later(one.numbers['vane_sd']!, (value) => (i === 1 ? 1.5 : 1) * value),
      vane_2: later(one.numbers['vane_2']!, (value) => value + (i === 2 ? 3 : 0)),
      vane: one.numbers['vane']!.map((value, row) => (i === 3 && row > 500 && row < 530 ? 4.25 : value)),
    },
  }))
  const draw = normals(77)
  const noisy = faulty.map((one) => ({
    ...one,
    numbers: {
      ...one.numbers,
      nacelle_position: one.numbers['nacelle_position']!.map(
        () => (((180 + 400 * draw()) % 360) + 360) % 360,
      ),
    },
  }))
  const ofVanes = (columns: readonly TurbineColumns[]) =>
    vaneAndAnemometer(frameOf(columns), SETTINGS).map(({ findings: all, tests }) => ({
      found: all.filter(({ sensor }) => sensor === 'vane'),
      tests: tests.filter(({ sensor }) => sensor === 'vane'),
    }))
  const expected = ofVanes(faulty)
  expect(expected.flatMap(({ found }) => found).length).toBeGreaterThanOrEqual(3)
  expect(ofVanes(noisy)).toEqual(expected)
})
