import type { Unit } from './units.ts'

/** One column of the log and what became of it. */
export interface MappedColumn {
  readonly name: string
  /** Position in a line, 0 = first. */
  readonly index: number
  /** Canonical channel with its suffix, or a key of the row; null = not used. */
  readonly takenFor: string | null
  /** How the cells become canonical numbers; null for text and keys. */
  readonly unit: Unit | null
  /** The unit as stated or assumed, for the receipt. */
  readonly unitText: string | null
  /** Whether header or map state the unit. */
  readonly unitStated: boolean
  readonly why: string
}
