import type { TurbineFrame } from './frame.ts'
import { REASON_CODE } from './set-aside.ts'

/**
 * The rows of a frame from a moment on. The power curve stays that of all rows: an offset bends it by a percent at most.
 *
 * @param fromMs  epoch ms; a moment before the first row gives the frame itself.
 */
export function rowsSince(frame: TurbineFrame, fromMs: number): TurbineFrame {
  return rowsBetween(frame, fromMs, Infinity)
}

/** The rows of a frame in [fromMs, toMs), as {@link rowsSince} gives them. */
export function rowsBetween(frame: TurbineFrame, fromMs: number, toMs: number): TurbineFrame {
  const n = frame.time.length
  const indexOf = (ms: number): number => {
    const first = frame.time.findIndex((time) => time >= ms)
    return first < 0 ? n : first
  }
  const from = indexOf(fromMs)
  const to = indexOf(toMs)
  if (from === 0 && to === n) return frame
  const cut = Object.entries(frame).map(([name, values]) => [
    name,
    isRowArray(values, n) ? values.slice(from, to) : (values as unknown),
  ])
  return Object.fromEntries(cut) as TurbineFrame
}

/** Reasons with rows before a moment set aside as `before-change`, unless they have another reason; length n. */
export function reasonsSince(frame: TurbineFrame, fromMs: number): Uint8Array {
  return frame.reason.map((code, i) =>
    code === 0 && frame.time[i]! < fromMs ? REASON_CODE['before-change'] : code,
  )
}

function isRowArray(values: unknown, n: number): values is Float64Array | Int32Array | Uint8Array {
  return ArrayBuffer.isView(values) && 'length' in values && values.length === n
}
