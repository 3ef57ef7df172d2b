import { Type } from 'typebox'

/** A number or null: null stands for "not known" and never for zero. */
export const Nullable = (description: string, options: { minimum?: number; maximum?: number } = {}) =>
  Type.Union([Type.Number(options), Type.Null()], { description })

/** [lower, upper] or [null, null] when there is no interval. */
export const Interval = (description: string) =>
  Type.Array(Type.Union([Type.Number(), Type.Null()]), { minItems: 2, maxItems: 2, description })

export const IsoTime = (description: string) =>
  Type.String({ format: 'date-time', description, examples: ['2026-03-01T00:00:00.000Z'] })

export const NullableIsoTime = (description: string) => Type.Union([IsoTime(description), Type.Null()])
