import { InputError } from '../errors.ts'

/** A unit that a column may be written in: canonical value = (x - subtract) / divideBy * multiplyBy. */
export interface Unit {
  readonly canonical: string
  readonly subtract: number
  readonly multiplyBy: number
  readonly divideBy: number
}

const unit = (canonical: string, parts: Partial<Omit<Unit, 'canonical'>> = {}): Unit => ({
  canonical,
  subtract: 0,
  multiplyBy: 1,
  divideBy: 1,
  ...parts,
})

/** By spelling: lower case, blanks and dots taken off. Degrees of arc and of Celsius share their sign: the channel tells. */
const UNITS: Readonly<Record<string, readonly Unit[]>> = {
  'm/s': [unit('m/s')],
  mps: [unit('m/s')],
  'ms-1': [unit('m/s')],
  'm/sec': [unit('m/s')],
  ms: [unit('m/s'), unit('us', { multiplyBy: 1000 })],
  us: [unit('us')],
  usec: [unit('us')],
  µs: [unit('us')],
  μs: [unit('us')],
  s: [unit('us', { multiplyBy: 1e6 })],
  'km/h': [unit('m/s', { divideBy: 3.6 })],
  kmh: [unit('m/s', { divideBy: 3.6 })],
  kph: [unit('m/s', { divideBy: 3.6 })],
  kn: [unit('m/s', { multiplyBy: 1852, divideBy: 3600 })],
  kt: [unit('m/s', { multiplyBy: 1852, divideBy: 3600 })],
  kts: [unit('m/s', { multiplyBy: 1852, divideBy: 3600 })],
  knots: [unit('m/s', { multiplyBy: 1852, divideBy: 3600 })],
  mph: [unit('m/s', { multiplyBy: 0.44704 })],
  '°': [unit('deg'), unit('degC')],
  deg: [unit('deg'), unit('degC')],
  degree: [unit('deg'), unit('degC')],
  degrees: [unit('deg'), unit('degC')],
  grad: [unit('deg'), unit('degC')],
  rad: [unit('deg', { multiplyBy: 180 / Math.PI })],
  radians: [unit('deg', { multiplyBy: 180 / Math.PI })],
  kw: [unit('kW')],
  w: [unit('kW', { divideBy: 1000 })],
  watt: [unit('kW', { divideBy: 1000 })],
  mw: [unit('kW', { multiplyBy: 1000 })],
  '°c': [unit('degC')],
  c: [unit('degC')],
  degc: [unit('degC')],
  celsius: [unit('degC')],
  k: [unit('degC', { subtract: 273.15 })],
  kelvin: [unit('degC', { subtract: 273.15 })],
  f: [unit('degC', { subtract: 32, multiplyBy: 5, divideBy: 9 })],
  '°f': [unit('degC', { subtract: 32, multiplyBy: 5, divideBy: 9 })],
  degf: [unit('degC', { subtract: 32, multiplyBy: 5, divideBy: 9 })],
  hpa: [unit('hPa')],
  mbar: [unit('hPa')],
  mb: [unit('hPa')],
  pa: [unit('hPa', { divideBy: 100 })],
  kpa: [unit('hPa', { multiplyBy: 10 })],
  bar: [unit('hPa', { multiplyBy: 1000 })],
  '%': [unit('%')],
  pct: [unit('%')],
  percent: [unit('%')],
  rpm: [unit('rpm')],
  'r/min': [unit('rpm')],
  'u/min': [unit('rpm')],
  '1/min': [unit('rpm')],
  'min-1': [unit('rpm')],
  hz: [unit('rpm', { multiplyBy: 60 })],
  'rad/s': [unit('rpm', { multiplyBy: 30 / Math.PI })],
  '1': [unit('1')],
}

/** The unit for a channel of this canonical unit; undefined when the spelling is unknown or measures something else. */
export function findUnit(spelling: string, canonical: string): Unit | undefined {
  const key = spelling
    .trim()
    .replace(/º|˚/g, '°')
    .replace(/[\s.·]/g, '')
    .replace('⁻¹', '-1')
    .replace('^', '')
  const found = UNITS[key.toLowerCase()]?.find((one) => one.canonical === canonical)
  // mW is a thousandth of a watt by the letter; no turbine is logged in it, so it is read as MW.
  return found
}

/** @throws InputError LOG_COLUMN_MAP naming the channel, its unit and the spelling given */
export function requireUnit(spelling: string, channel: string, canonical: string): Unit {
  const found = findUnit(spelling, canonical)
  if (found) return found
  const known = Object.keys(UNITS).filter((key) => UNITS[key]!.some((one) => one.canonical === canonical))
  throw new InputError(
    'LOG_COLUMN_MAP',
    `columns.${channel}.unit: expected one of ${known.join(', ')}, got ${JSON.stringify(spelling)}`,
  )
}

/** SQL that converts `value`; the value itself where nothing is to be done, so that no digit changes. */
export function convertSql(value: string, from: Unit): string {
  let sql = value
  if (from.subtract !== 0) sql = `(${sql} - ${from.subtract}::DOUBLE)`
  if (from.multiplyBy !== 1) sql = `(${sql} * ${from.multiplyBy}::DOUBLE)`
  if (from.divideBy !== 1) sql = `(${sql} / ${from.divideBy}::DOUBLE)`
  return sql
}

/** The same arithmetic as `convertSql`, step by step. */
export function convert(value: number, from: Unit): number {
  let number = value
  if (from.subtract !== 0) number -= from.subtract
  if (from.multiplyBy !== 1) number *= from.multiplyBy
  if (from.divideBy !== 1) number /= from.divideBy
  return number
}
