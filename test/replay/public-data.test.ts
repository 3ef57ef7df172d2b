import { existsSync } from 'node:fs'
import { join } from 'node:path'
import { Value } from 'typebox/value'
import { expect, test } from 'vitest'
import { ScoreSheet } from '../../src/sheet/index.ts'
import { demoRequest, filesBelow, makeFolder, openService, removeFolder, SHARED } from './farm.ts'

const LOG = join(SHARED, 'data/sdwpf-two-days.csv')

/** Two days of 134 turbines of the public SDWPF data set (Zhou et al. 2022, arXiv:2208.04360). */
test.skipIf(!existsSync(LOG))(
  'two public days of 134 turbines are accounted for to the row, and are too few (skipped where ../shared/data is absent)',
  async () => {
    const folder = await makeFolder()
    const service = await openService(folder)
    try {
      const sheet = await service.replays.oneShot({
        ...demoRequest(),
        logs: [{ name: 'sdwpf-two-days.csv', path: LOG }],
        site: {},
        reading: {
          startDate: '2020-05-01',
          columns: {
            turbine: 'TurbID',
            wind_speed: 'Wspd',
            vane: 'Wdir',
            air_temperature: 'Etmp',
            nacelle_position: 'Ndir',
            pitch: 'Pab1',
            power: 'Patv',
            day: 'Day',
            clock: 'Tmstamp',
          },
        },
      })
      // Counted when the file was put together: 134 turbines x 288 rows, 160 of them blank but for their keys.
      expect(sheet.rows).toEqual({ received: 38_592, accepted: 38_432, duplicate: 0, rejected: 160 })
      expect(sheet.receipt.rejectedByReason.map(({ reason, rows }) => ({ reason, rows }))).toEqual([
        { reason: 'no-values', rows: 160 },
      ])
      expect(sheet.turbines).toHaveLength(134)
      let accepted = 0
      for (const { turbine, rows, verdict, staticOffset } of sheet.turbines) {
        accepted += rows.accepted
        expect(rows.used + rows.setAside.reduce((sum, one) => sum + one.rows, 0), turbine).toBe(rows.accepted)
        expect(['undetermined', 'blocked'], turbine).toContain(verdict)
        if (verdict === 'undetermined') expect(staticOffset.furtherNote, turbine).not.toBe('')
      }
      expect(accepted).toBe(38_432)
      expect(sheet.turbines.filter(({ verdict }) => verdict === 'undetermined').length).toBeGreaterThan(100)
      expect(sheet.worklist).toEqual([])
      const read: unknown = JSON.parse(JSON.stringify(sheet))
      expect([...Value.Errors(ScoreSheet, read)]).toEqual([])
      expect(filesBelow(service.store.tempFolder)).toEqual([])
    } finally {
      await service.close()
      await removeFolder(folder)
    }
  },
)
