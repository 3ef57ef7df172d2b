export type { Coverage, CoverageDay, CoverageWindow } from './coverage.ts'
export { createIntake, type Intake, type IntakeParts } from './create-intake.ts'
export type { LogDescription, LogSource } from '../log/index.ts'
export type { StoredBatch } from '../store/index.ts'
