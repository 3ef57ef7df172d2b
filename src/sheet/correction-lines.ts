import type { CorrectionProof } from './correction.ts'

/** Outcomes that somebody must hear of: what was entered is not in force, or turns the rotor away from the wind. */
const ALARMS: readonly CorrectionProof['outcome'][] = ['wrong way', 'not taken hold']

/** Whether the outcome of a correction calls for somebody at the controller. */
export function isAlarm({ outcome }: Pick<CorrectionProof, 'outcome'>): boolean {
  return ALARMS.includes(outcome)
}

/** What became of corrections as a person reads it, those that call for somebody first; unwrapped, one paragraph each. */
export function correctionLines(corrections: readonly CorrectionProof[]): string[] {
  const rank = (proof: CorrectionProof): number => (proof.urgent ? 0 : isAlarm(proof) ? 1 : 2)
  return corrections
    .map((proof, order) => ({ proof, order }))
    .sort((a, b) => rank(a.proof) - rank(b.proof) || a.order - b.order)
    .map(({ proof }) => {
      const mark = proof.urgent ? '!! URGENT ' : isAlarm(proof) ? '! ' : ''
      const outcome = isAlarm(proof) ? proof.outcome.toUpperCase() : proof.outcome
      return `${mark}${proof.turbine}, ${correctionHead(proof)}: ${outcome}. ${proof.advice} ${proof.reason}`
    })
}

/** What was entered, and when. */
export function correctionHead({ enteredDeg, at }: Pick<CorrectionProof, 'enteredDeg' | 'at'>): string {
  return `${enteredDeg > 0 ? '+' : ''}${enteredDeg} degrees entered ${at.slice(0, 16).replace('T', ' ')} UTC`
}
