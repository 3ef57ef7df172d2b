import { changeStudy } from './change-points.study.ts'
import { correctionStudy } from './corrections.study.ts'
import { honestAnemometers } from './honest-anemometers.study.ts'
import { yawMoveStudy } from './yaw-moves.study.ts'
import { neighboursStudy } from './neighbours.study.ts'

/** Prints the tables of the studies: `npm run study`, or `npm run study -- honest 40`. */
const [name = 'all', count = '24'] = process.argv.slice(2)
const print = (text: string): void => {
  process.stdout.write(`${text}\n`)
}
if (!/^\d+$/.test(count)) throw new Error(`farms: expected a whole number, got "${count}"`)
if (name === 'all' || name === 'honest') honestAnemometers(Number(count), print)
if (name === 'all' || name === 'neighbours') neighboursStudy(Number(count), print)
if (name === 'all' || name === 'moves') yawMoveStudy(Number(count), print)
if (name === 'all' || name === 'changes') changeStudy(Number(count), print)
if (name === 'all' || name === 'corrections') correctionStudy(Number(count), print)
