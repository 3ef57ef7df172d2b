import { expect, test } from 'vitest'
import { checkShape, parseSite } from '../../src/setup/index.ts'
import { ReadingOptions, ScoringSettings } from '../../src/sheet/index.ts'

const wrong = (code: string, message: string) => expect.objectContaining({ code, message }) as Error

test('a site file that fits is given back as it is', () => {
  const site = {
    site: 'quern-hill',
    timezone: 'Europe/Berlin',
    turbines: [{ turbine: 'Q01', ratedPowerKw: 2300, vane: { logged: 'afterCorrection', sign: 1 } }],
    corrections: [{ turbine: 'Q01', at: '2026-03-02T10:00:00Z', enteredDeg: 6 }],
  }
  expect(parseSite(JSON.stringify(site), 'site')).toEqual(site)
  expect(parseSite('\uFEFF{}', 'site')).toEqual({})
})

test.each([
  [
    '{"turbines":[{"turbine":"A","ratedPowerKw":-1}]}',
    'site.turbines[0].ratedPowerKw: expected a number above 0 up to 50000, got -1',
  ],
  [
    '{"turbines":[{"turbine":"A","ratedPowerKw":"2300"}]}',
    'site.turbines[0].ratedPowerKw: expected a number above 0 up to 50000, got "2300"',
  ],
  ['{"turbines":[{"turbine":"A","vane":{"sign":2}}]}', 'site.turbines[0].vane.sign: expected 1 or -1, got 2'],
  ['{"turbines":[{}]}', 'site.turbines[0].turbine: expected a value, got none'],
  ['{"turbines":[{"turbine":""}]}', 'site.turbines[0].turbine: expected at least 1 character, got ""'],
  ['[]', 'site: expected an object, got []'],
  ['null', 'site: expected an object, got null'],
  [
    '{"corrections":[{"turbine":"A","at":"soon","enteredDeg":2}]}',
    'site.corrections[0].at: expected a date-time, got "soon"',
  ],
  [
    '{"turbines":[{"turbine":"A"},{"turbine":"A"}]}',
    'site.turbines[1].turbine: expected every turbine once, got "A" again',
  ],
  [
    '{"value":{"currency":"EUR","monthlyPricesPerMwh":[1,2,3]}}',
    'site.value.monthlyPricesPerMwh: expected a list of 12, got a list of 3',
  ],
  [
    JSON.stringify({ value: { currency: 'EUR', hourlyPricesPerMwh: Array.from({ length: 25 }, () => 50) } }),
    'site.value.hourlyPricesPerMwh: expected a list of 24, got a list of 25',
  ],
  [
    JSON.stringify({
      value: {
        currency: 'EUR',
        hourlyPricesPerMwh: Array.from({ length: 24 }, (_, i) => (i === 7 ? null : 50)),
      },
    }),
    'site.value.hourlyPricesPerMwh[7]: expected a number from -100000 up to 100000, got null',
  ],
  ['{"value":{"pricePerMwh":60}}', 'site.value.currency: expected a value, got none'],
  [
    '{"value":{"currency":"EUR","visitCost":900}}',
    'site.value: expected exactly one of pricePerMwh, monthlyPricesPerMwh, hourlyPricesPerMwh, got none',
  ],
  [
    JSON.stringify({
      value: { currency: 'EUR', pricePerMwh: 60, hourlyPricesPerMwh: Array.from({ length: 24 }, () => 50) },
    }),
    'site.value: expected exactly one of pricePerMwh, monthlyPricesPerMwh, hourlyPricesPerMwh, got pricePerMwh and hourlyPricesPerMwh',
  ],
  ['{"longTerm":{"meanWindSpeedMs":7.1}}', 'site.longTerm.source: expected a value, got none'],
])('the site file %s is refused with place, expected and got', (json, message) => {
  expect(() => parseSite(json, 'site')).toThrow(wrong('BAD_SITE', message))
})

test('an unknown name is refused with those that are known', () => {
  const call = () => parseSite('{"turbins":[]}', 'site')
  expect(call).toThrow(
    wrong(
      'BAD_SITE',
      'site.turbins: expected one of site, timezone, stamp, intervalS, runningStatus, turbines, longTerm, value, corrections, events, exclude, got an unknown name',
    ),
  )
})

test('a long wrong value is not repeated in full', () => {
  const call = () => parseSite(JSON.stringify({ timezone: 'x'.repeat(5000) }), 'site')
  expect(call).toThrow(/^site.timezone: expected at most 60 characters, got "x{79}\.\.\.$/)
})

test('a value of a union is refused with what each branch expected', () => {
  const call = (columns: unknown) => () =>
    checkShape(ReadingOptions, { columns }, { code: 'BAD_OPTION', place: '' })
  expect(call({ vane: 3 })).toThrow(wrong('BAD_OPTION', 'columns.vane: expected text or an object, got 3'))
  expect(call({ vane: { column: 'x', unti: 'rad' } })).toThrow(
    wrong(
      'BAD_OPTION',
      'columns.vane: expected text or an object with column, unit, got {"column":"x","unti":"rad"}',
    ),
  )
})

test('text counts as a number only where values are text', () => {
  const shape = ScoringSettings.properties.exponent
  expect(() => checkShape(shape, '3', { code: 'BAD_OPTION', place: 'exponent' })).toThrow(
    wrong('BAD_OPTION', 'exponent: expected a number from 0.5 up to 6, got "3"'),
  )
  expect(() =>
    checkShape(shape, '3', { code: 'BAD_OPTION', place: 'exponent', fromText: true }),
  ).not.toThrow()
})

test.each([NaN, Infinity, null, undefined, {}, []])('%s is no number', (value) => {
  const shape = ScoringSettings.properties.exponent
  expect(() => checkShape(shape, value, { code: 'BAD_OPTION', place: 'exponent' })).toThrow(
    expect.objectContaining({ code: 'BAD_OPTION' }) as Error,
  )
})
