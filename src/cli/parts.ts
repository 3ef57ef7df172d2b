import type { Readable, Writable } from 'node:stream'
import type { Intake } from '../intake/index.ts'
import type { Replays } from '../replay/contract.ts'
import type { Setup } from '../setup/index.ts'
import type { ScoringSettings } from '../sheet/index.ts'

/** Settings given on the command line: name of the setting -> the flag it came by and its text. */
export type SettingFlags = Record<string, { readonly flag: string; readonly value: string }>

/** What scores a log without a service. */
export interface Scoring {
  readonly replays: Replays
  readonly intake: Intake
  readonly settings: ScoringSettings
  /** An empty folder of this run, removed by `close`. */
  readonly tempFolder: string
  close(): Promise<void>
}

/** A data folder that this process alone works on. */
export interface Archive {
  readonly replays: Replays
  readonly setup: Setup
  readonly settings: ScoringSettings
  close(): Promise<void>
}

export type Terminal = Writable & { readonly isTTY?: boolean; readonly columns?: number }

/** Everything that a command needs from outside. */
export interface CommandParts {
  readonly version: string
  readonly stdin: Readable
  readonly stdout: Terminal
  readonly stderr: Terminal
  /** Every setting with its range, unit and default, for the help text. */
  readonly settingsHelp: string
  /** @throws InputError BAD_CONFIG, BAD_OPTION */
  startScoring(flags: SettingFlags): Promise<Scoring>
  /** @throws InputError BAD_CONFIG, BAD_OPTION; NOT_READY while a service uses the folder */
  openArchive(flags: SettingFlags): Promise<Archive>
  /** Resolves when the service has stopped. @throws InputError BAD_CONFIG, BAD_OPTION */
  serve(flags: SettingFlags): Promise<void>
}
