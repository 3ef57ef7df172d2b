import { disagree } from '../neighbours/farm-estimates.ts'
import type { ReferenceOffset } from './reference-offset.ts'
import type { StaticOffsetAnswer } from './static-offset.ts'

/**
 * Puts the estimate of a reference instrument in front: it leans on neither power nor anemometer. What power says stays
 * beside it, and a difference beyond chance between the two is told. The exponent has no say in a reference, so d is the
 * same for each.
 *
 * @param reference  null: the log holds none, and the answer stays as it is.
 */
export function preferReference(
  answer: StaticOffsetAnswer,
  reference: ReferenceOffset | null,
): StaticOffsetAnswer {
  if (reference === null) return answer
  const counts = { rows: reference.rows, days: reference.days }
  if (reference.failure) {
    const refused = {
      method: reference.method,
      estimateDeg: null,
      interval95Deg: [null, null],
      leansOn: `not used: ${reference.failure.text}`,
      kind: 'direct' as const,
      ...counts,
    }
    return { ...answer, sheet: { ...answer.sheet, estimates: [...answer.sheet.estimates, refused] } }
  }
  const { offsetDeg, standingDeg, halfWidthDeg, standingHalfWidthDeg } = reference
  const interval = [offsetDeg - halfWidthDeg, offsetDeg + halfWidthDeg]
  const standingInterval = [standingDeg - standingHalfWidthDeg, standingDeg + standingHalfWidthDeg] as const
  const [first] = answer.sheet.estimates
  const byPower = answer.standing
    ? {
        offsetDeg: answer.standing.offsetDeg,
        halfWidthDeg: ((first?.interval95Deg[1] ?? NaN) - (first?.interval95Deg[0] ?? NaN)) / 2,
      }
    : null
  const apart = byPower !== null && disagree({ offsetDeg, halfWidthDeg }, byPower)
  const byExponent = answer.byExponent.map(({ exponent }) => ({ exponent, offsetDeg, standingDeg }))
  return {
    ...answer,
    failure: null,
    byExponent,
    disagreement: apart
      ? `estimates differ beyond chance: ${reference.method} ${offsetDeg.toFixed(1)}, power against vane ${byPower.offsetDeg.toFixed(1)}`
      : null,
    standing: { offsetDeg, standingDeg, standingInterval95Deg: standingInterval },
    sheet: {
      ...answer.sheet,
      estimateDeg: offsetDeg,
      interval95Deg: interval,
      standingMisalignmentDeg: standingDeg,
      standingInterval95Deg: [...standingInterval],
      intervalParts: {
        statistical: reference.standingStatistical,
        response: 0,
        exponent: 0,
        instrument: reference.instrument,
        dilution: 0,
      },
      method: reference.method,
      estimates: [
        {
          method: reference.method,
          estimateDeg: offsetDeg,
          interval95Deg: interval,
          leansOn: `${reference.leansOn}; ${reference.kindText}`,
          kind: 'direct',
          ...counts,
        },
        ...answer.sheet.estimates,
      ],
      byExponent: byExponent.map(({ exponent }) => ({
        exponent,
        estimateDeg: offsetDeg,
        standingMisalignmentDeg: standingDeg,
      })),
      ...counts,
    },
  }
}
