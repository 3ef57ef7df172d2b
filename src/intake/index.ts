export type { Coverage, CoverageDay, CoverageWindow } from './coverage.ts'
export { createIntake, type Intake, type IntakeParts } from './create-intake.ts'
