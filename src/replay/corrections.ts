import { correctionHead, correctionLines, isAlarm } from '../sheet/correction-lines.ts'
import type { CorrectionProof, ScoreSheet } from '../sheet/index.ts'

/**
 * A sheet with what became of the corrections: those that call for somebody stand first among the warnings and first in
 * the advice of their turbine. Of several corrections of one turbine the last one counts there.
 */
export function withCorrections(sheet: ScoreSheet, corrections: readonly CorrectionProof[]): ScoreSheet {
  const last = new Map(corrections.map((proof) => [proof.turbine, proof]))
  const alarms = [...last.values()].filter(isAlarm)
  const advised = new Map(
    alarms.map((proof) => [
      proof.turbine,
      `${proof.urgent ? 'URGENT: ' : ''}${proof.outcome.toUpperCase()}, ${correctionHead(proof)}. ${proof.advice}`,
    ]),
  )
  return {
    ...sheet,
    corrections: [...corrections],
    turbines: sheet.turbines.map((turbine) => {
      const advice = advised.get(turbine.turbine)
      return advice === undefined ? turbine : { ...turbine, advice: [advice, ...turbine.advice] }
    }),
    warnings: [...correctionLines(alarms), ...sheet.warnings],
  }
}
