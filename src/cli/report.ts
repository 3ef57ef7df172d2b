import { ERRORS, InputError } from '../errors.ts'
import type { Terminal } from './parts.ts'

/** Says in one line what went wrong. @returns the exit status that belongs to the error. */
export function report(error: unknown, stderr: Terminal, wantsStack = false): number {
  const code = error instanceof InputError ? error.code : systemCode(error)
  const text = error instanceof Error ? error.message : String(error)
  stderr.write(`error ${code}: ${oneLine(text)}\n`)
  if (code === 'INTERNAL' && !wantsStack) {
    stderr.write('This is a fault of the program; --log-level debug shows where it arose.\n')
  }
  if (wantsStack && error instanceof Error) stderr.write(`${error.stack ?? ''}\n`)
  return error instanceof InputError ? ERRORS[error.code].exit : 1
}

function systemCode(error: unknown): string {
  const code = error instanceof Error ? (error as NodeJS.ErrnoException).code : undefined
  if (code === 'ENOSPC' || code === 'EDQUOT') return 'STORAGE_FULL'
  return typeof code === 'string' && /^E[A-Z]+$/.test(code) ? code : 'INTERNAL'
}

function oneLine(text: string): string {
  return text.replaceAll(/\s*\n\s*/g, '; ').slice(0, 2000)
}
