import { CommanderError } from 'commander'
import type { CommandParts, Terminal } from './parts.ts'
import { buildProgram } from './program.ts'
import { report } from './report.ts'

/**
 * Runs one command.
 *
 * @param args  the arguments after the name of the program.
 * @returns exit status: 0 done, 1 failed, 2 wrong use, 10 a sweep found that someone should climb. It never throws for a mistake of the caller, and it never prints a stack
 *   unless the log level is debug or trace.
 */
export async function runCommandLine(args: readonly string[], parts: CommandParts): Promise<number> {
  ignoreBrokenPipe(parts.stdout)
  ignoreBrokenPipe(parts.stderr)
  let status = 0
  const program = buildProgram(parts, (given) => {
    status = given
  })
  try {
    await program.parseAsync(args, { from: 'user' })
    return status
  } catch (error) {
    if (error instanceof CommanderError) {
      // The help and the version are no mistakes; everything else has been said by the program already.
      return error.exitCode === 0 ? 0 : 2
    }
    const wantsStack = /--log-level[= ](debug|trace)\b/.test(args.join(' '))
    return report(error, parts.stderr, wantsStack)
  }
}

/** `yawledger ... | head` closes the pipe early: what is left to print is dropped. */
function ignoreBrokenPipe(stream: Terminal): void {
  stream.on('error', (error: NodeJS.ErrnoException) => {
    if (error.code !== 'EPIPE') throw error
  })
}
