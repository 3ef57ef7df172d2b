import { wrap180 } from '../../kernel/angle/index.ts'
import { medianOf, studentQuantile } from '../../kernel/stats/index.ts'
import type { Frame, TurbineFrame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'
import type { Block } from './readiness.ts'

/** A nacelle step of less is no move: noise of the reading, or the tail of a move, degrees. */
const MOVE_DEG = 1.5
/** Steps and turns beyond this weigh no more, degrees. */
const CLIP_DEG = 20
/** Rows of less than a minute are compared a minute apart: a move takes that long. */
const SHORTEST_STEP_S = 60
/** Turns of the wind are taken over so long: what the farm shares outgrows what each turbine has for itself. */
const TURN_S = 1800
/** Fewer moves than this decide nothing. */
const FEW_MOVES = 30
/** Days are the blocks of the test; a log of fewer is cut into blocks of three hours. */
const FEW_DAYS = 8
const SHORT_BLOCK_MS = 3 * 3_600_000
/** Fewer blocks than this decide nothing. */
const FEW_BLOCKS = 5
/** Chance of a wrong word on one turbine whose vane and nacelle have nothing to do with each other, one side. */
const CHANCE = 0.0005
/** Moves or turns that must go the same way (or the other), besides the test over blocks; correlation. */
const LEAST_CORRELATION = 0.1
/** Fewer turbines than this have no majority. */
const FEWEST_TURBINES = 3

type SensorFinding = TurbineSheet['sensors'][number]

/** What the log says of a turbine's signs. */
export interface SignCheck {
  readonly turbine: string
  /** The site file states vane.sign. */
  readonly stated: boolean
  /** Nacelle moves that were compared with the vane before them. */
  readonly moves: number
  /** Nacelle moves against the vane: true = the nacelle follows its vane; null = it cannot be told. */
  readonly agrees: boolean | null
  /** Correlation of moves with the vane, no unit; NaN without moves. */
  readonly moveCorrelation: number
  /** N + v turns as the neighbours' does: true; against it: false; null = it cannot be told. */
  readonly neighboursAgree: boolean | null
  /** Correlation of the turns, no unit; NaN without neighbours. */
  readonly turnCorrelation: number
  /** Whether the sign counts as checked: stated, or confirmed by moves and neighbours both. */
  readonly checked: boolean
  readonly text: string
  /** Forbids an offset; null when nothing does. */
  readonly block: Block | null
  readonly findings: readonly SensorFinding[]
}

/**
 * Whether vane and nacelle position have the signs they are taken to have.
 *
 * A nacelle turns towards where its vane points: after a positive vane the reading must rise. That shows whether the two
 * agree; both may still be reversed. Then N + v turns against the neighbours' N + v, which is told apart from three turbines
 * on. A convention that the whole farm shares cannot be seen this way: a reference or the site file settles it.
 *
 * @param frame  vanes already carry the sign that the site file states.
 * @returns one entry per turbine, in order.
 */
export function signChecks(frame: Frame): SignCheck[] {
  const turns = frame.turbines.map((turbine) => turnsOf(turbine, frame))
  const consensus = consensusOfOthers(turns)
  return frame.turbines.map((turbine, k) => {
    const own = ownMoves(turbine)
    const neighbours = consensus === null ? UNKNOWN : neighbourTurns(turns[k]!, consensus)
    return conclude(turbine, own, neighbours, frame.turbines.length)
  })
}

/** Sums of one comparison, and what they say. */
interface Agreement {
  readonly agrees: boolean | null
  readonly correlation: number
  readonly pairs: number
}

const UNKNOWN: Agreement = { agrees: null, correlation: NaN, pairs: 0 }

/** Correlations about zero by block of time: an agreement that holds block by block is no accident. */
class PairSums {
  readonly #blocks = new Map<number, { xy: number; xx: number; yy: number }>()
  readonly #all = { xy: 0, xx: 0, yy: 0 }
  #pairs = 0

  add(block: number, x: number, y: number): void {
    let sums = this.#blocks.get(block)
    if (!sums) this.#blocks.set(block, (sums = { xy: 0, xx: 0, yy: 0 }))
    for (const to of [sums, this.#all]) {
      to.xy += x * y
      to.xx += x * x
      to.yy += y * y
    }
    this.#pairs++
  }

  agreement(): Agreement {
    const correlation = correlationOf(this.#all)
    const pairs = this.#pairs
    // One front must not outweigh all other days: each block counts by its correlation, not by its turns.
    const blocks = [...this.#blocks.values()].map(correlationOf).filter((value) => !Number.isNaN(value))
    const n = blocks.length
    if (pairs < FEW_MOVES || n < FEW_BLOCKS || !(Math.abs(correlation) >= LEAST_CORRELATION)) {
      return { agrees: null, correlation, pairs }
    }
    const mean = blocks.reduce((sum, value) => sum + value, 0) / n
    const variance = blocks.reduce((sum, value) => sum + (value - mean) ** 2, 0) / (n - 1)
    const t = mean / Math.sqrt(variance / n)
    const sure = Math.abs(t) > studentQuantile(1 - CHANCE, n - 1)
    return { agrees: sure ? t > 0 : null, correlation, pairs }
  }
}

function correlationOf(sums: { xy: number; xx: number; yy: number }): number {
  return sums.xy / Math.sqrt(sums.xx * sums.yy)
}

/** Days of the calendar, or three hours where there are few days. */
function blockOf(time: Float64Array, day: Int32Array): (i: number) => number {
  const n = time.length
  if (n > 0 && day[n - 1]! - day[0]! + 1 >= FEW_DAYS) return (i) => day[i]!
  return (i) => Math.floor(time[i]! / SHORT_BLOCK_MS)
}

/** Steps of the nacelle against the vane of the row before, rows in which the turbine runs. */
function ownMoves(turbine: TurbineFrame): Agreement {
  const { time, vane, nacellePosition, running, intervalS } = turbine
  const lag = Math.max(1, Math.round(SHORTEST_STEP_S / intervalS))
  const stepMs = lag * intervalS * 1000
  const usual = medianOf(vane.filter((_, i) => running[i] === 1))
  const block = blockOf(time, turbine.day)
  const sums = new PairSums()
  for (let i = 0; i + lag < time.length; i++) {
    if (running[i] !== 1 || running[i + lag] !== 1) continue
    if (!(Math.abs(time[i + lag]! - time[i]! - stepMs) < stepMs / 10)) continue
    const step = wrap180(nacellePosition[i + lag]! - nacellePosition[i]!)
    const off = wrap180(vane[i]! - usual)
    if (!(Math.abs(step) > MOVE_DEG) || Number.isNaN(off)) continue
    sums.add(block(i), clip(step), clip(off))
  }
  return sums.agreement()
}

interface Turns {
  /** Moment of each turn, in intervals from the start of the frame. */
  readonly slot: Int32Array
  readonly block: Int32Array
  /** Change of N + v over half an hour, degrees, clipped. */
  readonly turnDeg: Float64Array
}

/** Turns of the indicated direction over half an hour, at moments of the farm's common clock, while the turbine runs. */
function turnsOf(turbine: TurbineFrame, frame: Frame): Turns {
  const lag = Math.max(1, Math.round(TURN_S / frame.intervalS))
  const stepMs = lag * frame.intervalS * 1000
  const stride = Math.max(1, Math.floor(lag / 3)) // longer rows: every one; seconds: every ten minutes
  const { time, indicatedDirection, running } = turbine
  const block = blockOf(time, turbine.day)
  const slot: number[] = []
  const blocks: number[] = []
  const turnDeg: number[] = []
  for (let i = 0; i + lag < time.length; i++) {
    if (running[i] !== 1 || running[i + lag] !== 1) continue
    const at = Math.round((time[i]! - frame.fromMs) / (frame.intervalS * 1000))
    if (at % stride !== 0 || !(Math.abs(time[i + lag]! - time[i]! - stepMs) < stepMs / 10)) continue
    const turn = wrap180(indicatedDirection[i + lag]! - indicatedDirection[i]!)
    if (Number.isNaN(turn)) continue
    slot.push(at)
    blocks.push(block(i))
    turnDeg.push(clip(turn))
  }
  return {
    slot: Int32Array.from(slot),
    block: Int32Array.from(blocks),
    turnDeg: Float64Array.from(turnDeg),
  }
}

/** For a turbine, the median turn of the others at each moment where at least two know theirs. */
type Consensus = (at: number, ownTurnDeg: number) => number

/** NaN where too few others turn; null for too small a farm. */
function consensusOfOthers(turns: readonly Turns[]): Consensus | null {
  if (turns.filter(({ slot }) => slot.length > 0).length < FEWEST_TURBINES) return null
  const bySlot = new Map<number, number[]>()
  for (const { slot, turnDeg } of turns) {
    slot.forEach((at, i) => {
      const list = bySlot.get(at)
      if (list) list.push(turnDeg[i]!)
      else bySlot.set(at, [turnDeg[i]!])
    })
  }
  for (const list of bySlot.values()) list.sort((a, b) => a - b)
  return (at, ownTurnDeg) => {
    const sorted = bySlot.get(at)!
    const others = sorted.length - 1
    if (others < FEWEST_TURBINES - 1) return NaN
    const own = sorted.indexOf(ownTurnDeg)
    const nth = (rank: number): number => sorted[rank < own ? rank : rank + 1]!
    return (nth((others - 1) >> 1) + nth(others >> 1)) / 2
  }
}

function neighbourTurns(own: Turns, consensus: Consensus): Agreement {
  const sums = new PairSums()
  own.slot.forEach((at, i) => {
    const others = consensus(at, own.turnDeg[i]!)
    if (!Number.isNaN(others)) sums.add(own.block[i]!, own.turnDeg[i]!, others)
  })
  return sums.agreement()
}

function clip(angleDeg: number): number {
  return Math.max(-CLIP_DEG, Math.min(CLIP_DEG, angleDeg))
}

function conclude(turbine: TurbineFrame, own: Agreement, neighbours: Agreement, turbines: number): SignCheck {
  const stated = turbine.setup.vane?.sign !== undefined
  const confirmed = own.agrees === true && neighbours.agrees === true
  const wrong = contradiction(own, neighbours)
  const text = stated
    ? `the sign of the vane is stated in the site file${confirmed ? ', and yaw moves and neighbours confirm it' : ''}`
    : (wrong?.text ?? (confirmed ? confirmation(own) : missingPieces(turbine, own, neighbours, turbines)))
  const findings: SensorFinding[] = []
  if (wrong) {
    const caution = stated
      ? `${wrong.text}. The site file states vane.sign, so the offset is given; directions made of nacelle and vane are not to be trusted`
      : wrong.text
    findings.push(findingOf(turbine, wrong.sensor, caution, stated ? 'warn' : 'fault', own, neighbours))
  }
  return {
    turbine: turbine.turbine,
    stated,
    moves: own.pairs,
    agrees: own.agrees,
    moveCorrelation: own.correlation,
    neighboursAgree: neighbours.agrees,
    turnCorrelation: neighbours.correlation,
    checked: stated || confirmed,
    text,
    block: wrong && !stated ? { code: wrong.code, text: wrong.text, finding: findings[0]! } : null,
    findings,
  }
}

interface Contradiction {
  readonly code: string
  readonly sensor: SensorFinding['sensor']
  readonly text: string
}

function contradiction(own: Agreement, neighbours: Agreement): Contradiction | null {
  if (own.agrees === false) {
    const seen = `the nacelle turns away from its vane: of ${own.pairs} yaw moves most go against it (correlation ${own.correlation.toFixed(2)})`
    if (neighbours.agrees === true) {
      return {
        code: 'sign-disagrees',
        sensor: 'vane',
        text: `${seen}; the neighbours' wind turns as the nacelle does, so it is the vane that is reversed: set vane.sign to -1 in the site file if that is so`,
      }
    }
    if (neighbours.agrees === false) {
      return {
        code: 'sign-disagrees',
        sensor: 'nacelle-position',
        text: `${seen}; the neighbours' wind turns against the nacelle, so it is the nacelle position that is reversed: set vane.sign to 1 in the site file if that is so`,
      }
    }
    return {
      code: 'sign-disagrees',
      sensor: 'vane',
      text: `${seen}: vane or nacelle position is reversed; find out which, and set vane.sign in the site file`,
    }
  }
  if (own.agrees === true && neighbours.agrees === false) {
    return {
      code: 'signs-reversed',
      sensor: 'vane',
      text: `nacelle and vane agree, but wind direction made of them turns against that of the other turbines (correlation ${neighbours.correlation.toFixed(2)}): both seem reversed; set vane.sign in the site file`,
    }
  }
  return null
}

function confirmation(own: Agreement): string {
  return `${own.pairs} yaw moves follow the vane, and the wind turns as it does for the other turbines; a convention that all of them share would not show`
}

function missingPieces(
  turbine: TurbineFrame,
  own: Agreement,
  neighbours: Agreement,
  turbines: number,
): string {
  const pieces: string[] = []
  if (turbine.nacellePosition.every((position) => Number.isNaN(position))) {
    pieces.push('there is no nacelle position in the log')
  } else if (own.pairs < FEW_MOVES) {
    pieces.push(`${own.pairs} yaw moves are too few, ${FEW_MOVES} are needed`)
  } else if (own.agrees === null) {
    pieces.push(`${own.pairs} yaw moves do not tell whether the nacelle follows the vane`)
  }
  if (neighbours.agrees === null) {
    pieces.push(
      turbines < FEWEST_TURBINES
        ? `neighbours that show the direction are needed, ${FEWEST_TURBINES} turbines in all`
        : 'the wind of the other turbines does not tell',
    )
  } else if (!neighbours.agrees) {
    pieces.push('the wind of the other turbines turns the other way')
  }
  return `the sign of the vane is not checked: ${pieces.join('; ')}. State vane.sign in the site file`
}

function findingOf(
  turbine: TurbineFrame,
  sensor: SensorFinding['sensor'],
  text: string,
  severity: SensorFinding['severity'],
  own: Agreement,
  neighbours: Agreement,
): SensorFinding {
  const { time, intervalS } = turbine
  return {
    sensor,
    kind: 'reversed-sign',
    finding: text,
    severity,
    howSure: 'likely',
    checkFirst:
      'At the desk: watch vane and nacelle position live while the turbine yaws one way, and compare with the sign conventions of the log.',
    from: new Date(time[0]!).toISOString(),
    to: new Date(time[time.length - 1]! + intervalS * 1000).toISOString(),
    detail: {
      yawMoves: own.pairs,
      moveCorrelation: own.correlation,
      turnCorrelation: neighbours.correlation,
    },
  }
}
