import { mkdtemp, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { Readable, Writable } from 'node:stream'
import { runCommandLine, type CommandParts, type SettingFlags } from '../../src/cli/index.ts'
import type { Intake } from '../../src/intake/index.ts'
import type { Setup } from '../../src/setup/index.ts'
import { ReplaysInMemory } from '../http/replays-in-memory.ts'
import { settingsExample } from '../http/sheet-example.ts'

class Captured extends Writable {
  text = ''
  isTTY = false
  override _write(chunk: Buffer, _encoding: BufferEncoding, done: () => void) {
    this.text += chunk.toString()
    done()
  }
}

interface Options {
  stdin?: string
  watched?: boolean
  intake?: Intake
  setup?: Setup
  replays?: ReplaysInMemory
}

/** Runs a command in this process over replays in memory, and keeps what it printed. */
export async function runCli(args: string[], options: Options = {}) {
  const tempFolder = await mkdtemp(join(tmpdir(), 'yawledger-cli-'))
  const replays = options.replays ?? new ReplaysInMemory()
  const stdout = new Captured()
  const stderr = new Captured()
  stderr.isTTY = options.watched ?? false
  const settings: SettingFlags[] = []
  const served: SettingFlags[] = []
  let closed = 0
  const parts: CommandParts = {
    version: '0.1.0',
    stdin: Readable.from([options.stdin ?? '']),
    stdout,
    stderr,
    settingsHelp: '  YAWLEDGER_PORT\n',
    startScoring(flags) {
      settings.push(flags)
      const close = async () => {
        closed++
        await rm(tempFolder, { recursive: true, force: true })
      }
      return Promise.resolve({
        replays,
        intake: options.intake ?? ({} as Intake),
        settings: settingsExample(),
        tempFolder,
        close,
      })
    },
    openArchive(flags) {
      settings.push(flags)
      const close = () => {
        closed++
        return Promise.resolve()
      }
      const setup = options.setup ?? ({} as Setup)
      return Promise.resolve({ replays, setup, settings: settingsExample(), close })
    },
    serve(flags) {
      served.push(flags)
      return Promise.resolve()
    },
  }
  const status = await runCommandLine(args, parts)
  return { status, out: stdout.text, err: stderr.text, replays, settings, served, closed }
}
