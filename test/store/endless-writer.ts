/**
 * Writes to a store without end, saying on standard output what it is about to do and what was acknowledged, so that
 * whoever kills it knows what must be there. Arguments: data folder, first number.
 */
import { writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { openStore } from '../../src/store/index.ts'
import { addRows } from './logs.ts'

const [folder, first] = [process.argv[2]!, Number(process.argv[3])]
const MARCH_END = Date.UTC(2026, 3, 1)

let id = 0
const store = await openStore({
  folder,
  clock: Date.now,
  newId: () => `w${first}-${++id}`,
  keepFreeBytes: 0,
  compaction: { mergeCount: 3, largeRows: 100 },
})
await store.sites.put('quern-hill', { turbines: [{ turbine: 'Q01' }, { turbine: 'Q02' }] })

const say = (what: string, n: number) => process.stdout.write(`${what} ${n}\n`)
const batches = new Map<number, string>()
say('ready', first)
for (let n = first; ; n++) {
  const rejectedPath = join(store.tempFolder, `rejected-${n}.csv`)
  await writeFile(rejectedPath, `${n}`)
  // Two turbines in two months: four rows of one log that must stand or fall together.
  const rows = [-2, -1, 0, 1].map((k) => [k % 2 ? 'Q01' : 'Q02', MARCH_END + k * 3_600_000 + n, n] as const)
  say('posting', n)
  batches.set(
    n,
    (await addRows(store, 'quern-hill', rows, { contentKey: `n${n}`, rejectedPath })).batch.batch,
  )
  say('posted', n)
  if (n % 4 === 3) {
    const gone = n - 2
    const batch = batches.get(gone)
    if (batch !== undefined) {
      say('removing', gone)
      await store.logs.remove('quern-hill', batch)
      say('removed', gone)
    }
  }
  const frame = join(store.tempFolder, `frame-${n}`)
  await writeFile(frame, `frame ${n}`)
  await store.replays.begin({ id: `r${n}`, site: null, createdMs: n })
  await store.frames.keep(`r${n}`, frame)
  await store.replays.finish(`r${n}`, `sheet ${n}`, n)
  say('scored', n)
}
