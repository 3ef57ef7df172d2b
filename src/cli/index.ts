export { runCommandLine } from './run-command-line.ts'
export type { Archive, CommandParts, Scoring, SettingFlags } from './parts.ts'
