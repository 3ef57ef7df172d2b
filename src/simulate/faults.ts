import { InputError } from '../errors.ts'

/** A spell in which something is otherwise at one turbine; times in seconds from the start of the scenario. */
export interface Spell {
  /** Index of the turbine, 0 = first. */
  turbine: number
  fromS: number
  toS: number
}

/** A number that belongs to a kind of fault. */
interface Amount {
  /** What it is, with its unit. */
  readonly is: string
  readonly usual: number
  readonly min: number
  readonly max: number
}

interface FaultDescription {
  readonly sensor: 'vane' | 'nacelle-position' | 'anemometer' | 'yaw-drive' | 'controller'
  /** What happens while it lasts. */
  readonly does: string
  readonly size?: Amount
  readonly place?: Amount
}

const amount = (is: string, usual: number, min: number, max: number): Amount => ({ is, usual, min, max })

/** Every fault that can be put into a made-up farm. Unless said otherwise the controller believes its vane. */
export const FAULTS = {
  'vane-frozen': { sensor: 'vane', does: 'the vane keeps its first value' },
  'vane-iced': {
    sensor: 'vane',
    does: 'it freezes on the farm (about -1 degrees C) and the vane keeps its first value',
  },
  'vane-knocked': {
    sensor: 'vane',
    does: 'the vane reads so much more; its offset falls by as much',
    size: amount('degrees', 6, -180, 180),
  },
  'vane-dead-sector': {
    sensor: 'vane',
    does: 'angles inside the sector are read as the nearer of its edges',
    size: amount('width in degrees', 20, 1, 180),
    place: amount('its middle in degrees', 40, -180, 180),
  },
  'vane-stuck-bit': {
    sensor: 'vane',
    does: 'one track of the Gray-coded disc is stuck; without `vaneBits` the disc has 8',
    size: amount('track, 0 = finest', 2, 0, 15),
    place: amount('what it reads: 0 or 1', 0, 0, 1),
  },
  'vane-coarse-step': {
    sensor: 'vane',
    does: 'the vane is read in steps',
    size: amount('degrees', 11.25, 0.1, 90),
  },
  'vane-noise': {
    sensor: 'vane',
    does: 'the noise that the rotor does not feel is so many times the usual: damping lost, or a stiff bearing below 1',
    size: amount('times the usual noise', 3, 0, 20),
  },
  'vane-spikes': {
    sensor: 'vane',
    does: 'single seconds read any angle',
    size: amount('spikes an hour', 6, 0.01, 1800),
  },
  'vane-not-followed': {
    sensor: 'vane',
    does: 'the controller goes by another vane; the logged one swings by itself and shows only a share of the wind',
    size: amount('share, 0 to 1', 0, 0, 1),
  },
  'vane-idle-bias': {
    sensor: 'vane',
    does: 'the vane reads so much more while the rotor does not drive it: the swirl behind a turning rotor was calibrated in',
    size: amount('degrees', 8, -90, 90),
  },
  'vane-reversed': { sensor: 'vane', does: 'the log holds the vane with the other sign' },
  'second-vane-drift': {
    sensor: 'vane',
    does: 'the second vane drifts away from the first',
    size: amount('degrees a day', 0.3, -20, 20),
  },
  'nacelle-shift': {
    sensor: 'nacelle-position',
    does: 'the reading is so much more',
    size: amount('degrees', 24, -360, 360),
  },
  'nacelle-drift': {
    sensor: 'nacelle-position',
    does: 'the reading slips slowly',
    size: amount('degrees a day', 0.5, -360, 360),
  },
  'nacelle-zero-lost': {
    sensor: 'nacelle-position',
    does: 'after 9 of 10 stops the zero is another one',
    size: amount('degrees, standard deviation of the new zero', 60, 0.1, 180),
  },
  'nacelle-stuck': { sensor: 'nacelle-position', does: 'the reading keeps its first value' },
  'nacelle-jumps': {
    sensor: 'nacelle-position',
    does: 'the reading jumps and comes back after 1 to 20 minutes',
    size: amount('degrees, either way', 40, -180, 180),
    place: amount('jumps a day', 4, 0.01, 100),
  },
  'nacelle-missing-pulses': {
    sensor: 'nacelle-position',
    does: 'pulses of clockwise turns are missed, so that the reading falls behind with travel',
    size: amount('share of clockwise travel', 0.01, 0, 1),
  },
  'nacelle-coarse-step': {
    sensor: 'nacelle-position',
    does: 'the reading comes in steps',
    size: amount('degrees', 15, 0.1, 180),
  },
  'nacelle-across-north': {
    sensor: 'nacelle-position',
    does: 'the logger takes the arithmetic mean of wrapped readings, and errs where north is crossed',
  },
  'nacelle-reversed': {
    sensor: 'nacelle-position',
    does: 'the reading falls when the nacelle turns clockwise',
  },
  'anemometer-gain': {
    sensor: 'anemometer',
    does: 'the reading is multiplied',
    size: amount('factor', 0.9, 0, 5),
  },
  'anemometer-drift': {
    sensor: 'anemometer',
    does: 'the gain drifts',
    size: amount('relative change a day', -0.002, -0.2, 0.2),
  },
  'anemometer-stuck': { sensor: 'anemometer', does: 'the reading keeps its first value' },
  'anemometer-iced': {
    sensor: 'anemometer',
    does: 'it freezes on the farm (about -1 degrees C); within an hour the cups turn slower, and answer late',
    size: amount('factor', 0.6, 0, 1),
  },
  'yaw-slow': {
    sensor: 'yaw-drive',
    does: 'the nacelle turns at so many times the usual rate',
    size: amount('factor', 0.4, 0.02, 5),
  },
  'yaw-hunting': {
    sensor: 'controller',
    does: 'the controller follows the mean of 20 s at once',
    size: amount('start threshold in degrees', 2.5, 0.2, 20),
  },
  'yaw-overshoot': {
    sensor: 'yaw-drive',
    does: 'the nacelle turns on after it was stopped',
    size: amount('degrees', 6, 0.1, 60),
  },
  'yaw-unbalanced': {
    sensor: 'controller',
    does: 'counter-clockwise moves need so many times the usual yaw error before they begin',
    size: amount('factor', 2, 0.1, 10),
  },
  'yaw-wide-threshold': {
    sensor: 'controller',
    does: 'all moves need so many times the usual yaw error before they begin',
    size: amount('factor', 2, 0.1, 10),
  },
  'yaw-deliberate': {
    sensor: 'controller',
    does: 'the controller holds its vane off zero while the nacelle faces a sector of 60 degrees',
    size: amount('degrees', 12, -60, 60),
    place: amount('middle of the sector, degrees', 240, 0, 360),
  },
  'yaw-no-untwist': {
    sensor: 'controller',
    does: 'cables are never untwisted; they start out twisted by whole turns',
    size: amount('turns', 2, -10, 10),
  },
} as const satisfies Record<string, FaultDescription>

export type FaultKind = keyof typeof FAULTS
export const FAULT_KINDS = Object.keys(FAULTS) as FaultKind[]

/** Something that goes wrong at a turbine for a spell. */
export interface Fault extends Spell {
  kind: FaultKind
  /** As `FAULTS` says for the kind; without it the usual one. */
  size?: number
  place?: number
}

/** A fault with its numbers; null = the kind has no such number. */
export interface SizedFault extends Spell {
  kind: FaultKind
  size: number | null
  place: number | null
}

/** The fault with the usual numbers of its kind where it names none. */
export function sizedFault(fault: Fault): SizedFault {
  const { turbine, kind, fromS, toS } = fault
  const described: FaultDescription = FAULTS[kind]
  return {
    turbine,
    kind,
    fromS,
    toS,
    size: described.size ? (fault.size ?? described.size.usual) : null,
    place: described.place ? (fault.place ?? described.place.usual) : null,
  }
}

/** The faults of one turbine, with their numbers. */
export function faultsOf(faults: readonly Fault[], turbine: number): SizedFault[] {
  return faults.filter((fault) => fault.turbine === turbine).map(sizedFault)
}

/** @throws InputError OUT_OF_RANGE with the number and its kind */
export function checkFault(fault: Fault): void {
  if (!FAULT_KINDS.includes(fault.kind)) {
    throw new InputError(
      'OUT_OF_RANGE',
      `fault: expected one of ${FAULT_KINDS.join(', ')}, got ${JSON.stringify(fault.kind)}`,
    )
  }
  if (!(fault.fromS < fault.toS)) {
    throw new InputError(
      'OUT_OF_RANGE',
      `fault ${fault.kind}: expected an end after its start, got ${fault.fromS} to ${fault.toS} s`,
    )
  }
  const described: FaultDescription = FAULTS[fault.kind]
  const sized = sizedFault(fault)
  for (const name of ['size', 'place'] as const) {
    const range = described[name]
    const value = sized[name]
    if (range && !(value !== null && value >= range.min && value <= range.max)) {
      throw new InputError(
        'OUT_OF_RANGE',
        `fault ${fault.kind}, ${name} (${range.is}): expected ${range.min} to ${range.max}, got ${String(value)}`,
      )
    }
  }
}
