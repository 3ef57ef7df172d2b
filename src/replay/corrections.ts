import type { CorrectionProof, ScoreSheet } from '../sheet/index.ts'

/** Outcomes that somebody must hear of: what was entered is not in force, or turns the rotor away from the wind. */
const ALARMS: readonly CorrectionProof['outcome'][] = ['wrong way', 'not taken hold']

/** Whether the outcome of a correction calls for somebody at the controller. */
export function isAlarm({ outcome }: CorrectionProof): boolean {
  return ALARMS.includes(outcome)
}

/**
 * A sheet with what became of the corrections: those that call for somebody stand first among the warnings and first in
 * the advice of their turbine. Of two corrections of one turbine the later one gives the advice.
 */
export function withCorrections(sheet: ScoreSheet, corrections: readonly CorrectionProof[]): ScoreSheet {
  const last = new Map(corrections.map((proof) => [proof.turbine, proof]))
  const alarms = corrections.filter(isAlarm).filter((proof) => last.get(proof.turbine) === proof)
  const advised = new Map(alarms.map((proof) => [proof.turbine, adviceOf(proof)]))
  return {
    ...sheet,
    corrections: [...corrections],
    turbines: sheet.turbines.map((turbine) => {
      const advice = advised.get(turbine.turbine)
      return advice === undefined ? turbine : { ...turbine, advice: [advice, ...turbine.advice] }
    }),
    warnings: [...alarms.map(warningOf), ...sheet.warnings],
  }
}

function warningOf(proof: CorrectionProof): string {
  return `${proof.urgent ? 'URGENT: ' : ''}${proof.turbine}: correction of ${headOf(proof)}: ${proof.outcome.toUpperCase()}. ${proof.advice} ${proof.reason}`
}

function adviceOf(proof: CorrectionProof): string {
  return `${proof.outcome.toUpperCase()}: correction of ${headOf(proof)}. ${proof.advice}`
}

function headOf({ enteredDeg, at }: CorrectionProof): string {
  return `${enteredDeg > 0 ? '+' : ''}${enteredDeg} degrees, ${at.slice(0, 16).replace('T', ' ')} UTC`
}
