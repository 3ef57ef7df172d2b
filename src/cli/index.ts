export { runCommandLine } from './run-command-line.ts'
export type { CommandParts, Scoring, SettingFlags } from './parts.ts'
