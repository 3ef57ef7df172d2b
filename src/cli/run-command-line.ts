import { CommanderError } from 'commander'
import { ERRORS, InputError } from '../errors.ts'
import type { CommandParts, Terminal } from './parts.ts'
import { buildProgram } from './program.ts'

/**
 * Runs one command.
 *
 * @param args  the arguments after the name of the program.
 * @returns exit status: 0 done, 1 failed, 2 wrong use. It never throws for a mistake of the caller, and it never prints a stack
 *   unless the log level is debug or trace.
 */
export async function runCommandLine(args: readonly string[], parts: CommandParts): Promise<number> {
  ignoreBrokenPipe(parts.stdout)
  ignoreBrokenPipe(parts.stderr)
  const program = buildProgram(parts)
  try {
    await program.parseAsync(args, { from: 'user' })
    return 0
  } catch (error) {
    if (error instanceof CommanderError) {
      // The help and the version are no mistakes; everything else has been said by the program already.
      return error.exitCode === 0 ? 0 : 2
    }
    const wantsStack = /--log-level[= ](debug|trace)\b/.test(args.join(' '))
    return report(error, parts.stderr, wantsStack)
  }
}

/** @returns the exit status that belongs to the error. */
function report(error: unknown, stderr: Terminal, wantsStack: boolean): number {
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

/** `yawledger ... | head` closes the pipe early: what is left to print is dropped. */
function ignoreBrokenPipe(stream: Terminal): void {
  stream.on('error', (error: NodeJS.ErrnoException) => {
    if (error.code !== 'EPIPE') throw error
  })
}
