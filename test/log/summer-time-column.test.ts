import { DateTime } from 'luxon'
import { expect, test } from 'vitest'
import { staged } from './staging.ts'

const zone = 'Europe/Berlin'
const start = DateTime.fromISO('2024-10-27', { zone }).toMillis()
const rows = Array.from({ length: 150 }, (_, i) => {
  const at = DateTime.fromMillis(start + i * 600_000, { zone })
  return { shown: at.toFormat('yyyy-MM-dd HH:mm'), summer: at.isInDST, power: i }
})
// Shuffled: the order of rows cannot tell which pass of the repeated hour is which.
const shuffled = [...rows].sort((a, b) => ((a.power * 7919) % 150) - ((b.power * 7919) % 150))
const expected = rows.map(({ power }) => [start + power * 600_000, power])
const logOf = (header: string, cell: (summer: boolean) => string): string =>
  `time,turbine,${header},power\n${shuffled.map((row) => `${row.shown},Q01,${cell(row.summer)},${row.power}`).join('\n')}\n`

test.each([
  ['dst', (summer: boolean) => (summer ? '1' : '0')],
  ['Summer time', (summer: boolean) => (summer ? 'true' : 'false')],
])(
  'a column %s tells the two passes of the repeated hour apart, whatever the order of rows',
  async (header, cell) => {
    const log = await staged({ 'a.csv': logOf(header, cell) }, { timezone: zone })
    expect(log.receipt.columns.find(({ column }) => column === header)?.takenFor).toBe('dst')
    expect(log.receipt.duplicate).toBe(0)
    expect(log.rows.map((row) => [row['time'], row['power']])).toEqual(expected)
    expect(log.receipt.warnings.join(' ')).not.toContain('twice in autumn')
  },
)

test('a column of another name is taken when the map says so, and without it rows out of order overrule each other', async () => {
  const text = logOf('flag', (summer) => (summer ? 'Y' : 'N'))
  const log = await staged({ 'a.csv': text }, { timezone: zone, columns: { dst: 'flag' } })
  expect(log.rows.map((row) => [row['time'], row['power']])).toEqual(expected)
  const without = await staged({ 'a.csv': text }, { timezone: zone })
  expect(without.receipt.duplicate).toBeGreaterThan(0)
  expect(without.receipt.received).toBe(
    without.receipt.accepted + without.receipt.duplicate + without.receipt.rejected,
  )
})
