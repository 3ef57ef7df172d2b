import type { FindingKind, SensorFinding } from '../../src/sheet/index.ts'
import type { FaultKind } from '../../src/simulate/index.ts'

/** A fault at a stated size, and what would count as having found it. */
export interface FaultCase {
  readonly kind: FaultKind
  readonly size?: number
  readonly place?: number
  /** How long it lasts; Infinity: until the end of the window. */
  readonly days: number
  /** Starts this many days after the window does, plus some hours that differ from farm to farm; 0: with the window. */
  readonly fromDay: number
  readonly sensors: readonly SensorFinding['sensor'][]
  readonly findings: readonly FindingKind[]
  /** The offset must have changed instead. */
  readonly changesOffset?: true
  /** Its start can be dated. */
  readonly dated?: true
  /** Bits of the vane's disc. */
  readonly vaneBits?: number
}

const vane = ['vane'] as const
const position = ['nacelle-position'] as const
const anemometer = ['anemometer'] as const
const drive = ['yaw-drive', 'controller'] as const
const late = { fromDay: 25, days: Infinity } as const
const whole = { fromDay: 0, days: Infinity } as const

/** Sizes are stated in the table: half of them are what a technician would call clear, the others what is worth a look. */
export const FAULT_CASES: readonly FaultCase[] = [
  { kind: 'vane-frozen', fromDay: 12, days: 0.5, sensors: vane, findings: ['frozen', 'icing'], dated: true },
  { kind: 'vane-frozen', fromDay: 33, days: 2, sensors: vane, findings: ['frozen', 'icing'], dated: true },
  { kind: 'vane-iced', fromDay: 20, days: 0.75, sensors: vane, findings: ['icing'], dated: true },
  { kind: 'vane-knocked', size: 7, ...late, sensors: vane, findings: [], changesOffset: true, dated: true },
  { kind: 'vane-dead-sector', size: 20, place: 30, ...whole, sensors: vane, findings: ['dead-sector'] },
  { kind: 'vane-stuck-bit', size: 2, ...whole, vaneBits: 8, sensors: vane, findings: ['stuck-bit'] },
  { kind: 'vane-coarse-step', size: 11.25, ...late, sensors: vane, findings: ['coarse-step'] },
  { kind: 'vane-noise', size: 3, ...late, sensors: vane, findings: ['noise-changed'], dated: true },
  { kind: 'vane-spikes', size: 12, ...late, sensors: vane, findings: ['spikes', 'noise-changed'] },
  { kind: 'vane-not-followed', ...late, sensors: ['vane', 'controller'], findings: ['no-longer-leads'] },
  { kind: 'vane-idle-bias', size: 10, ...whole, sensors: vane, findings: ['idle-bias'] },
  { kind: 'vane-reversed', ...whole, sensors: vane, findings: ['reversed-sign'] },
  { kind: 'second-vane-drift', size: 0.2, ...late, sensors: vane, findings: ['two-vanes-apart'] },
  { kind: 'nacelle-shift', size: 24, ...late, sensors: position, findings: ['position-step'], dated: true },
  { kind: 'nacelle-shift', size: 6, ...late, sensors: position, findings: ['position-step'], dated: true },
  { kind: 'nacelle-drift', size: 0.5, ...late, sensors: position, findings: ['slow-slip', 'missing-pulses'] },
  { kind: 'nacelle-zero-lost', size: 60, ...whole, sensors: position, findings: ['zero-lost'] },
  { kind: 'nacelle-stuck', fromDay: 25, days: 4, sensors: position, findings: ['frozen'], dated: true },
  { kind: 'nacelle-jumps', size: 40, place: 2, ...late, sensors: position, findings: ['impossible-jump'] },
  {
    kind: 'nacelle-missing-pulses',
    size: 0.01,
    ...whole,
    sensors: position,
    findings: ['missing-pulses', 'slow-slip'],
  },
  { kind: 'nacelle-coarse-step', size: 15, ...whole, sensors: position, findings: ['coarse-step'] },
  { kind: 'nacelle-across-north', ...whole, sensors: position, findings: ['averaged-across-north'] },
  { kind: 'nacelle-reversed', ...whole, sensors: position, findings: ['reversed-sign'] },
  { kind: 'anemometer-gain', size: 0.9, ...late, sensors: anemometer, findings: ['gain-off', 'gain-drift'] },
  {
    kind: 'anemometer-drift',
    size: -0.002,
    ...whole,
    sensors: anemometer,
    findings: ['gain-drift', 'gain-off'],
  },
  { kind: 'anemometer-stuck', fromDay: 25, days: 1, sensors: anemometer, findings: ['frozen'], dated: true },
  {
    kind: 'anemometer-iced',
    size: 0.6,
    fromDay: 20,
    days: 0.75,
    sensors: anemometer,
    findings: ['icing'],
    dated: true,
  },
  { kind: 'yaw-slow', size: 0.4, ...whole, sensors: drive, findings: ['slow-yaw'] },
  { kind: 'yaw-hunting', size: 2.5, ...whole, sensors: drive, findings: ['hunting'] },
  { kind: 'yaw-overshoot', size: 6, ...whole, sensors: drive, findings: ['overshoot'] },
  { kind: 'yaw-unbalanced', size: 2, ...whole, sensors: drive, findings: ['unbalanced-moves'] },
  { kind: 'yaw-wide-threshold', size: 2, ...whole, sensors: drive, findings: ['wide-threshold'] },
  { kind: 'yaw-deliberate', size: 12, ...whole, sensors: drive, findings: ['deliberate-yaw'] },
  { kind: 'yaw-no-untwist', size: 2, ...whole, sensors: drive, findings: ['cable-twist'] },
]
