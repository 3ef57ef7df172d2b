import { changeStudy } from './change-points.study.ts'
import { correctionStudy } from './corrections.study.ts'
import { faultStudy, soundFarms } from './faults.study.ts'
import { energyStudy } from './energy.study.ts'
import { halvesStudy } from './halves.study.ts'
import { highRateFaults } from './high-rate-faults.study.ts'
import { honestAnemometers } from './honest-anemometers.study.ts'
import { slippedAndFrozen } from './slipped-and-frozen.study.ts'
import { yawMoveStudy } from './yaw-moves.study.ts'
import { northStudy } from './north.study.ts'
import { wakeNorthStudy } from './wake-north.study.ts'
import { neighboursStudy } from './neighbours.study.ts'

/** Prints the tables of the studies: `npm run study`, or `npm run study -- honest 40`; what the number counts each study says. */
const [name = 'all', given] = process.argv.slice(2)
const count = given ?? { neighbours: '200', faults: '4', slipped: '6', 'faults-1hz': '3' }[name] ?? '24'
const print = (text: string): void => {
  process.stdout.write(`${text}\n`)
}
if (!/^\d+$/.test(count)) throw new Error(`count: expected a whole number, got "${count}"`)
if (name === 'all' || name === 'honest') honestAnemometers(Number(count), print)
if (name === 'all' || name === 'neighbours') neighboursStudy(Number(count), print)
if (name === 'all' || name === 'moves') yawMoveStudy(Number(count), print)
if (name === 'all' || name === 'changes') changeStudy(Number(count), print)
if (name === 'all' || name === 'corrections') correctionStudy(Number(count), print)
if (name === 'all' || name === 'north') northStudy(Number(count), print)
if (name === 'all' || name === 'faults') await faultStudy(Number(count), print)
if (name === 'all' || name === 'energy') energyStudy(Number(count), print)
if (['all', 'north', 'wakes'].includes(name)) wakeNorthStudy(Number(count), print)
if (name === 'all' || name === 'slipped') await slippedAndFrozen(Number(count), print)
if (name === 'all' || name === 'faults-1hz') await highRateFaults(Number(count), print)
if (name === 'all' || name === 'halves') halvesStudy(Number(count), print)
if (name === 'sound') await soundFarms(Number(count), print)
