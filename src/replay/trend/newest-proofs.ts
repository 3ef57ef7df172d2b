import type { CorrectionProof, ScoreSheet } from '../../sheet/index.ts'

/**
 * What became of each correction: by the newest sheet that could judge it, or that holds its time at all.
 *
 * @param sheets  newest made first.
 * @returns in the order of time.
 */
export function newestProofs(sheets: readonly ScoreSheet[]): CorrectionProof[] {
  const found = new Map<string, CorrectionProof>()
  for (const sheet of sheets) {
    for (const proof of sheet.corrections) {
      const key = JSON.stringify([proof.turbine, proof.at, proof.enteredDeg])
      const known = found.get(key)
      if (!known || (known.outcome === 'too early' && proof.outcome !== 'too early')) found.set(key, proof)
    }
  }
  return [...found.values()].sort((a, b) => Date.parse(a.at) - Date.parse(b.at))
}
