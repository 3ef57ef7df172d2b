import { wrap180 } from '../../kernel/angle/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import { disagree } from '../neighbours/farm-estimates.ts'
import { exponentDoubt, noDoubt } from './exponent-doubt.ts'
import { furtherDays } from './further-days.ts'
import { referenceConditions } from './offset-in-sheet.ts'
import type { ReferenceOffset } from './reference-offset.ts'
import type { StaticOffsetAnswer } from './static-offset.ts'

/** Steps through the range of exponents. */
const EXPONENTS = 16

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
  settings: ScoringSettings,
): StaticOffsetAnswer {
  if (reference === null) return answer
  const counts = { rows: reference.rows, days: reference.days }
  if (reference.failure) {
    const refused = {
      method: reference.method,
      estimateDeg: null,
      interval95Deg: [null, null],
      interval95GivenExponentDeg: [null, null],
      leansOn: `not used: ${reference.failure.text}`,
      kind: 'direct' as const,
      ...counts,
    }
    return { ...answer, sheet: { ...answer.sheet, estimates: [...answer.sheet.estimates, refused] } }
  }
  const { offsetDeg, standingDeg, halfWidthDeg, standingHalfWidthDeg } = reference
  const interval = [offsetDeg - halfWidthDeg, offsetDeg + halfWidthDeg]
  const standingInterval = [standingDeg - standingHalfWidthDeg, standingDeg + standingHalfWidthDeg] as const
  const apart = answer.standing !== null && disagreeAtEveryExponent(reference, answer, settings)
  const further = furtherDays(
    standingDeg,
    { shrinking: reference.standingStatistical, fixed: reference.instrument },
    reference.days,
    { thresholdDeg: settings.actionThresholdDeg, doubt: noDoubt(settings.exponent) },
  )
  const byExponent = answer.byExponent.map(({ exponent }) => ({ exponent, offsetDeg, standingDeg }))
  return {
    ...answer,
    failure: null,
    byExponent,
    disagreement: apart
      ? `estimates differ beyond chance: ${reference.method} ${offsetDeg.toFixed(1)}, power against vane ${answer.standing.offsetDeg.toFixed(1)}`
      : null,
    standing: {
      offsetDeg,
      standingDeg,
      standingInterval95Deg: standingInterval,
      standingInterval95GivenExponentDeg: standingInterval,
      endExponents: [settings.exponent, settings.exponent],
      gainInEstimate: 1,
    },
    sheet: {
      ...answer.sheet,
      estimateDeg: offsetDeg,
      interval95Deg: interval,
      interval95GivenExponentDeg: interval,
      standingMisalignmentDeg: standingDeg,
      standingInterval95Deg: [...standingInterval],
      standingInterval95GivenExponentDeg: [...standingInterval],
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
          interval95GivenExponentDeg: interval,
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
      byCondition: referenceConditions(answer.sheet.byCondition, reference),
      furtherDays: further.days,
      furtherNote: further.note,
      ...counts,
    },
  }
}

/** Power reads d with an exponent, a reference with none: only what no exponent of the range brings together is apart. */
function disagreeAtEveryExponent(
  reference: ReferenceOffset,
  { standing }: StaticOffsetAnswer,
  settings: ScoringSettings,
): boolean {
  if (!standing) return false
  const { given, low, high } = exponentDoubt(settings)
  const meanVaneDeg = standing.standingDeg - standing.offsetDeg
  const [from, to] = standing.standingInterval95GivenExponentDeg
  for (let k = 0; k <= EXPONENTS; k++) {
    const scale = given / (low + (k / EXPONENTS) * (high - low))
    const byPower = {
      offsetDeg: wrap180(standing.standingDeg * scale - meanVaneDeg),
      halfWidthDeg: ((to - from) / 2) * scale,
    }
    if (!disagree(reference, byPower)) return false
  }
  return true
}
