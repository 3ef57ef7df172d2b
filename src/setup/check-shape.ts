import { Ajv, type ErrorObject, type ValidateFunction } from 'ajv'
import addFormatsModule from 'ajv-formats'
import type { Static, TSchema } from 'typebox'
import { InputError, type ErrorCode } from '../errors.ts'

// The package is CommonJS and its types give the function as a property of the module.
const addFormats = addFormatsModule.default

const strictAjv = new Ajv({ allErrors: false, strict: false, verbose: true })
const coercingAjv = new Ajv({ allErrors: false, strict: false, verbose: true, coerceTypes: true })
addFormats(strictAjv)
addFormats(coercingAjv)

const compiled = {
  strict: new WeakMap<object, ValidateFunction>(),
  coercing: new WeakMap<object, ValidateFunction>(),
}

export interface ShapeOptions {
  /** Code of the error when the value does not fit. */
  readonly code: ErrorCode
  /** What the message starts with; empty: the name of the property alone. */
  readonly place: string
  /** Values are text, as in a query string: "3" counts as 3 under a number. The value is changed in place. */
  readonly fromText?: boolean
}

/**
 * A value that came from outside, checked against its schema.
 *
 * @returns the same value, typed.
 * @throws InputError with the code given; the message names the place, what was expected and what came.
 */
export function checkShape<T extends TSchema>(schema: T, value: unknown, options: ShapeOptions): Static<T> {
  const ajv = options.fromText === true ? coercingAjv : strictAjv
  const cache = options.fromText === true ? compiled.coercing : compiled.strict
  let validate = cache.get(schema)
  if (validate === undefined) {
    validate = ajv.compile(schema)
    cache.set(schema, validate)
  }
  if (!validate(value)) {
    const errors = validate.errors ?? []
    throw new InputError(options.code, explain(errors, options.place))
  }
  return value as Static<T>
}

/** A union fails once per branch and then as a whole: the branches, which come first, say what was expected. */
function explain(errors: readonly ErrorObject[], root: string): string {
  const last = errors.at(-1)
  if (last === undefined) return `${root}: does not fit its schema`
  const union = last.keyword === 'anyOf' || last.keyword === 'oneOf'
  const deepest = union ? deepestOf(errors) : undefined
  const error = deepest !== undefined && deepest.instancePath !== last.instancePath ? deepest : last
  if (error.keyword === 'additionalProperties') {
    const { additionalProperty } = error.params as { additionalProperty: string }
    const known = Object.keys((error.parentSchema?.['properties'] ?? {}) as object)
    const place = joinPlace(root, error.instancePath, additionalProperty)
    return `${place}: expected one of ${known.join(', ')}, got an unknown name`
  }
  if (error.keyword === 'required') {
    const { missingProperty } = error.params as { missingProperty: string }
    return `${joinPlace(root, error.instancePath, missingProperty)}: expected a value, got none`
  }
  const expected = union && error === last ? branches(errors, last) : expectation(error)
  const got = COUNTED.includes(error.keyword)
    ? `a list of ${(error.data as unknown[]).length}`
    : shown(error.data)
  return `${joinPlace(root, error.instancePath)}: expected ${expected}, got ${got}`
}

function deepestOf(errors: readonly ErrorObject[]): ErrorObject | undefined {
  const depth = (error: ErrorObject) => error.instancePath.split('/').length
  return errors.reduce<ErrorObject | undefined>(
    (deepest, error) => (deepest === undefined || depth(error) > depth(deepest) ? error : deepest),
    undefined,
  )
}

function branches(errors: readonly ErrorObject[], union: ErrorObject): string {
  const own = errors.filter((error) => error !== union && error.instancePath === union.instancePath)
  return [...new Set(own.map(expectation))].join(' or ')
}

/** Keywords that count the entries of a list: how many there are says more than the first of them. */
const COUNTED: readonly string[] = ['minItems', 'maxItems']

const ARTICLES: Readonly<Record<string, string>> = {
  number: 'a number',
  integer: 'a whole number',
  string: 'text',
  boolean: 'true or false',
  object: 'an object',
  array: 'a list',
  null: 'null',
}

/** What the schema wanted at this place: the whole range, whichever end was missed. */
function expectation(error: ErrorObject): string {
  const schema = (error.parentSchema ?? {}) as Record<string, unknown>
  if (error.keyword === 'const') return JSON.stringify(schema['const'])
  if (error.keyword === 'enum')
    return (schema['enum'] as unknown[]).map((one) => JSON.stringify(one)).join(' or ')
  if (error.keyword === 'format') return `a ${String(schema['format'])}`
  if (error.keyword === 'additionalProperties') {
    return `an object with ${Object.keys(schema['properties'] ?? {}).join(', ')}`
  }
  if (error.keyword === 'pattern') return `text that matches ${String(schema['pattern'])}`
  if (error.keyword === 'minLength') return `at least ${String(schema['minLength'])} character`
  if (COUNTED.includes(error.keyword)) return entries(schema)
  if (error.keyword === 'maxLength') return `at most ${String(schema['maxLength'])} characters`
  const type = ARTICLES[String(schema['type'])] ?? error.message ?? 'another value'
  const minimum = (schema['minimum'] ?? schema['exclusiveMinimum']) as number | undefined
  const maximum = (schema['maximum'] ?? schema['exclusiveMaximum']) as number | undefined
  if (minimum === undefined && maximum === undefined) {
    return ['type', 'minimum', 'maximum'].includes(error.keyword) ? type : (error.message ?? type)
  }
  const above = schema['exclusiveMinimum'] === undefined ? 'from' : 'above'
  const lower = minimum === undefined ? '' : ` ${above} ${minimum}`
  const upper = maximum === undefined ? '' : ` up to ${maximum}`
  return `${type}${lower}${upper}`
}

function entries(schema: Record<string, unknown>): string {
  const { minItems = 0, maxItems } = schema as { minItems?: number; maxItems?: number }
  if (minItems === maxItems) return `a list of ${minItems}`
  return `a list of ${minItems > 0 ? `at least ${minItems}` : `at most ${maxItems ?? 'any'}`}`
}

/** `/turbines/2/ratedPowerKw` -> `site.turbines[2].ratedPowerKw`. */
function joinPlace(root: string, pointer: string, property?: string): string {
  const parts = pointer.split('/').slice(1)
  if (property !== undefined) parts.push(property)
  let place = root
  for (const part of parts) {
    const name = part.replaceAll('~1', '/').replaceAll('~0', '~')
    place += /^\d+$/.test(name) ? `[${name}]` : `${place === '' ? '' : '.'}${name}`
  }
  return place === '' ? 'value' : place
}

const MAX_SHOWN = 80

function shown(value: unknown): string {
  const json =
    value === undefined ? 'nothing' : ((JSON.stringify(value) as string | undefined) ?? typeof value)
  return json.length > MAX_SHOWN ? `${json.slice(0, MAX_SHOWN)}...` : json
}
