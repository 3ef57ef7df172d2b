import { wrap180 } from '../../kernel/angle/index.ts'
import { medianOf } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { CorrectionProof } from '../../sheet/index.ts'
import { onGrid, type GridChannel } from '../neighbours/farm-grid.ts'
import { judgedStep, type JudgedStep } from './judged-step.ts'
import type { ProofFarm, ProofQuestion } from './proof-farm.ts'

/** Blocks that are taken as independent: local direction hangs together for hours, sectors for days. */
const BLOCKS_H = [1, 6, 24] as const
const LEAST_OTHERS = 2

type Seen = Exclude<CorrectionProof['heading']['seenIn'], null>

/** The step of the heading at a correction, and where it was seen. */
export interface HeadingAnswer {
  readonly seenIn: Seen
  readonly step: JudgedStep
}

/**
 * Whether a correction took hold, by the heading.
 *
 * Signs. With D the true wind direction, h the true heading, g = D - h the yaw error, N = h + n the nacelle position, and
 * v the logged vane, g = v + d:
 *
 *     N + v - D = h + n + v - D = n - g + v = n - d
 *     N - D     = n - g
 *
 * Entering c degrees adds c to the vane that the controller nulls. Its mean yaw error was m and becomes m - c: the nacelle
 * comes to stand c degrees further clockwise, so **N - D steps by +c**, whatever the log holds.
 * Where the log holds the vane *after* correction, v reads c more at the same g, so d becomes d - c and **N + v - D steps by
 * +c**; the mean of v stays at 0. Where it holds the vane *before* correction, d stays, so N + v - D does not step, and the
 * mean of v steps by -c: **-v steps by +c**.
 * N + v is the better instrument where it answers: the vane takes the yaw lag out. D is told by the neighbours, each up to a
 * constant, which cancels in a step. A step by -c: entered with the wrong sign. No step: never in force.
 */
export function headingAfterCorrection(
  farm: ProofFarm,
  question: ProofQuestion,
): { answer: HeadingAnswer | null; vaneLoggedSeen: CorrectionProof['vaneLoggedSeen'] } {
  const { target } = question
  const logged = farm.grid.turbines[target]!.setup.vane?.logged ?? 'unknown'
  const others = question.neighbours.filter((j) => farm.positionUsable[j])
  const byPosition =
    farm.positionUsable[target] && others.length >= LEAST_OTHERS
      ? {
          sum: against(farm, question, others, farm.indicatedDeg),
          position: against(farm, question, others, farm.positionDeg),
        }
      : null
  if (byPosition) {
    const { sum, position } = byPosition
    const vaneLoggedSeen = loggedBy(sum, position, question.enteredDeg)
    const answer: HeadingAnswer =
      logged === 'afterCorrection'
        ? { seenIn: 'nacelle position + vane', step: sum }
        : { seenIn: 'nacelle position', step: position }
    if (!Number.isNaN(answer.step.halfWidth)) return { answer, vaneLoggedSeen }
  }
  if (logged !== 'beforeCorrection') return { answer: null, vaneLoggedSeen: null }
  const step = byVane(farm, question)
  return { answer: Number.isNaN(step.halfWidth) ? null : { seenIn: 'vane', step }, vaneLoggedSeen: null }
}

/** One of two headings steps by the degrees entered in either case; the other one tells what is logged. */
function loggedBy(
  sum: JudgedStep,
  position: JudgedStep,
  enteredDeg: number,
): CorrectionProof['vaneLoggedSeen'] {
  const nears = ({ step, halfWidth }: JudgedStep, deg: number): boolean =>
    Math.abs(step - deg) <= halfWidth && halfWidth < Math.abs(enteredDeg) / 2
  if (!nears(position, enteredDeg)) return null
  if (nears(sum, enteredDeg)) return 'afterCorrection'
  return nears(sum, 0) ? 'beforeCorrection' : null
}

/** Steps of a turbine's own channel against the median N + v of the others, by sector of the wind. */
function against(
  farm: ProofFarm,
  question: ProofQuestion,
  others: readonly number[],
  channel: GridChannel,
): JudgedStep {
  const { direction, sector, sectors } = farm
  const local = (values: Float64Array, i: number): Float64Array =>
    values.map((value, t) => wrap180(value - direction.consensusDeg[t]! - direction.constantDeg[i]!))
  const localOthers = new Map(others.map((j) => [j, local(farm.indicatedDeg[j]!, j)]))
  return judgedStep({
    ...question,
    neighbours: others,
    cells: sectors,
    day: farm.grid.day,
    clock: farm.clock,
    blocksH: BLOCKS_H,
    seriesOf(i) {
      const own = local(channel[i]!, i)
      const value = own.map((angle, t) => {
        if (Number.isNaN(angle)) return NaN
        const shown: number[] = []
        for (const [j, values] of localOthers)
          if (j !== i && !Number.isNaN(values[t]!)) shown.push(values[t]!)
        return shown.length >= LEAST_OTHERS - (localOthers.has(i) ? 1 : 0)
          ? wrap180(angle - medianOf(shown))
          : NaN
      })
      return { value, cell: sector }
    },
  })
}

/** Steps of the mean of -v of a vane that is logged before correction: the controller holds it where the correction puts it. */
function byVane(farm: ProofFarm, question: ProofQuestion): JudgedStep {
  const vane = onGrid(farm.grid, (turbine, row) => (producing(turbine, row) ? -turbine.vane[row]! : NaN))
  const cell = new Int32Array(farm.grid.length)
  return judgedStep({
    ...question,
    cells: 1,
    day: farm.grid.day,
    clock: farm.clock,
    blocksH: BLOCKS_H,
    seriesOf: (i) => ({ value: vane[i]!, cell }),
  })
}

function producing(turbine: TurbineFrame, row: number): boolean {
  return turbine.running[row] === 1
}
