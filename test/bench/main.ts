import { benchScoring } from './scoring.bench.ts'

/** Prints what the speed targets come out at: `npm run bench`. */
benchScoring((text) => {
  process.stdout.write(`${text}\n`)
})
