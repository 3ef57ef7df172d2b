import type { Progress } from '../replay/contract.ts'
import type { Terminal } from './parts.ts'

const ERASE_LINE = '\r\u001b[2K'

/** One line that says how far a replay is; silent when nobody watches. */
export function progressLine(terminal: Terminal): { show: (progress: Progress) => void; clear: () => void } {
  if (terminal.isTTY !== true) return { show: () => undefined, clear: () => undefined }
  let shown = ''
  return {
    show({ stage, share }) {
      const line = `${stage} ${Math.round(100 * Math.min(1, Math.max(0, share)))} %`
      if (line !== shown) terminal.write(`${ERASE_LINE}${line}`)
      shown = line
    },
    clear() {
      if (shown !== '') terminal.write(ERASE_LINE)
      shown = ''
    },
  }
}
