import { toUtf8, validUtf8, type sniffEncoding } from './clean-text.ts'
import type { LogLimits, LogSource } from './contract.ts'
import { sourceBytes } from './source-bytes.ts'
import { textLines } from './text-lines.ts'

export interface SentLine {
  /** Line number, 1 = first. */
  readonly line: number
  readonly text: string
}

/** The lines of a log as text, for the few questions that one pass over its bytes leaves open. */
export async function* sentLines(
  source: LogSource,
  limits: LogLimits,
  encoding: ReturnType<typeof sniffEncoding>,
): AsyncGenerator<SentLine> {
  const { chunks } = await sourceBytes(source, limits)
  const position = { lines: 0 }
  for await (const slab of textLines(source.name, toUtf8(chunks, encoding), limits.maxLineBytes, position)) {
    const lines = validUtf8(slab).bytes.toString('utf8').split('\n')
    // The text behind the last line end is empty.
    lines.pop()
    for (const text of lines) yield { line: ++position.lines, text }
  }
}
