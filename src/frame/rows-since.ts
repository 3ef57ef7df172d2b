import type { TurbineFrame } from './frame.ts'
import { REASON_CODE } from './set-aside.ts'

/**
 * The rows of a frame from a moment on. The power curve stays that of all rows: an offset bends it by a percent at most.
 *
 * @param fromMs  epoch ms; a moment before the first row gives the frame itself.
 */
export function rowsSince(frame: TurbineFrame, fromMs: number): TurbineFrame {
  const n = frame.time.length
  const first = frame.time.findIndex((time) => time >= fromMs)
  const from = first < 0 ? n : first
  if (from === 0) return frame
  const cut = Object.entries(frame).map(([name, values]) => [
    name,
    isRowArray(values, n) ? values.slice(from) : (values as unknown),
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
