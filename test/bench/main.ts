import { join } from 'node:path'
import { benchFarm } from './farm.bench.ts'
import { benchHighRate } from './high-rate.bench.ts'
import { benchIntake } from './intake.bench.ts'
import { benchScoring } from './scoring.bench.ts'

/** Prints what the speed targets come out at: `npm run bench` for scoring,
 * `npm run bench -- farm` for 25 turbines over 90 days, `npm run bench -- intake [main.js]` for intake,
 * `npm run bench -- high-rate` for looking at 1 Hz rows. */
const print = (text: string): void => {
  process.stdout.write(`${text}\n`)
}
const [name = 'scoring', main = join(import.meta.dirname, '../../dist/main.js')] = process.argv.slice(2)
if (name === 'scoring') benchScoring(print)
else if (name === 'farm') await benchFarm(print)
else if (name === 'intake') await benchIntake(print, { main })
else if (name === 'high-rate') await benchHighRate(print)
else throw new Error(`bench: expected scoring, farm, intake or high-rate, got ${name}`)
