import type { FindingKind } from '../../sheet/index.ts'
import {
  explain,
  halfWidth,
  minute,
  near,
  ofKinds,
  overlap,
  pick,
  said,
  signed,
  spells,
  WORK_OF_THAT_DAY,
  type Explanation,
  type Rule,
  type RuleInput,
} from './explanation.ts'

/** Beyond this nobody set a vane wrong: it is bent, loose or mis-mounted. */
const LARGE_DEG = 10
const VANE_QUALITY: readonly FindingKind[] = [
  'noise-changed',
  'coarse-step',
  'spikes',
  'stuck-bit',
  'dead-sector',
]
const READ_PARAMETER =
  'At the desk: read the vane offset entered in the controller and when it was last changed.'
const PHOTOGRAPH = 'At the desk: ask for a photograph of the vane, its mount and its zero mark.'
const REFERENCE =
  'A reference for yaw error on one turbine for two weeks: a nacelle lidar or a surveyed mast.'

/** What is said of the vane, the offset, and what holds for the turbine as a whole: each rule says what it sees, or null. */
export const VANE_RULES: readonly Rule[] = [
  blocked,
  oneCauseForAll,
  vaneTouched,
  notFollowed,
  deliberate,
  ownOffset,
  twoVanes,
  vaneStill,
  vaneQuality,
  idleBias,
]

function blocked({ sheet }: RuleInput): Explanation | null {
  if (sheet.verdict !== 'blocked') return null
  const findings = pick(sheet, ({ severity }) => severity === 'fault')
  return explain(
    100,
    `Nothing can be said of the offset before this is put right: ${sheet.reason}.`,
    findings,
  )
}

function oneCauseForAll({ sheet, sameWay }: RuleInput): Explanation | null {
  const standing = sheet.staticOffset.standingMisalignmentDeg
  if (sameWay === null || standing === null) return null
  const { turbines, model, medianDeg, spreadDeg } = sameWay
  const own = standing - medianDeg
  const half = halfWidth(sheet)
  const apart =
    Math.abs(own) > Math.max(3, half)
      ? ` What this turbine has beyond the others (${signed(own)} degrees) is its own.`
      : ''
  return {
    weight: 90,
    text:
      `All ${turbines} turbines of model ${model} stand off the same way (median ${signed(medianDeg)} degrees, spread ${spreadDeg.toFixed(1)}): ` +
      `one cause for all of them - how the anemometers answer to yaw, a constant or a flow correction in the controller - is likelier than ${turbines} vanes that were mounted wrong.${apart}`,
    evidence: [
      `standing misalignment ${signed(standing)} degrees here, median of the model ${signed(medianDeg)}`,
    ],
    wouldSettle: [
      'At the desk: the controller software and vane parameters of the model, and since when they are what they are.',
      REFERENCE,
    ],
    findings: pick(sheet, ({ kind, sensor }) => kind === 'yaw-response' && sensor === 'anemometer'),
  }
}

function vaneTouched({ sheet }: RuleInput): Explanation | null {
  const changes = sheet.staticOffset.changes.filter(({ seenIn }) => seenIn !== 'heading')
  const [change] = changes.slice(-1)
  if (!change) return null
  const same = pick(
    sheet,
    (finding) =>
      finding.sensor === 'vane' &&
      [...VANE_QUALITY, 'two-vanes-apart', 'icing', 'frozen'].includes(finding.kind) &&
      [finding.from, finding.to].some((edge) => near(edge, change.at)),
  )
  const size = change.sizeDeg === null ? 'an unknown amount' : `${signed(change.sizeDeg)} degrees`
  const [low = null, high = null] = change.sizeInterval95Deg
  const interval = low === null || high === null ? '' : ` [${signed(low)}, ${signed(high)}]`
  const what = `its offset changed by ${size}${interval} about ${minute(change.at)}`
  const still = same.filter(({ kind }) => kind === 'icing' || kind === 'frozen')
  const quality = same.filter((finding) => !still.includes(finding))
  const cause =
    change.seenIn === 'event'
      ? `The vane offset changed when the site file says that something was done: ${what}.`
      : quality.length > 0
        ? `The vane was touched or replaced: ${what}, and the vane itself reads differently since the same day.`
        : still.length > 0
          ? `The vane was moved, by ice or by who freed it: ${what}, at an edge of the time it stood still.`
          : `The vane moved on its mount, or the offset in the controller was changed: ${what}, and the vane otherwise reads as before.`
  const earlier = changes.length > 1 ? ` It is the last of ${changes.length} changes.` : ''
  return {
    weight: 84,
    text: cause + earlier,
    evidence: [
      `${what}, seen ${change.seenIn === 'both' ? 'in the heading against the farm and in power' : `by ${change.seenIn === 'event' ? 'the site file' : change.seenIn}`}`,
      ...same.map(said),
    ],
    wouldSettle: [WORK_OF_THAT_DAY, READ_PARAMETER, PHOTOGRAPH],
    findings: quality,
  }
}

function notFollowed({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, ['no-longer-leads'])
  if (findings.length === 0) return null
  return explain(
    88,
    'The controller no longer goes by the vane that is logged: offset and yaw error from this vane do not say where the rotor stands.',
    findings,
    ['At the desk: which of the vanes the controller uses, and since when.'],
  )
}

function deliberate({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, ['deliberate-yaw'])
  if (findings.length === 0) return null
  const offset =
    sheet.verdict === 'offset'
      ? ' The standing misalignment contains it: compare the sectors outside before anything is entered.'
      : ''
  return explain(
    82,
    `The controller stands off the wind on purpose in some directions: sector management or wake steering, not a vane.${offset}`,
    findings,
    ['At the desk: sector settings of the controller, and whether the operator knows of them.'],
  )
}

function ownOffset({ sheet, sameWay }: RuleInput): Explanation | null {
  const standing = sheet.staticOffset.standingMisalignmentDeg
  if (sheet.verdict !== 'offset' || standing === null || sameWay !== null) return null
  const constant = sheet.staticOffset.changes.length === 0 ? ', all through the window' : ''
  const uneven = ofKinds(sheet, ['unbalanced-moves'])
  const response = pick(sheet, ({ kind, sensor }) => kind === 'yaw-response' && sensor === 'anemometer')
  const what =
    Math.abs(standing) > LARGE_DEG
      ? 'that is more than anyone sets wrong, so look for a bent, loose or mis-mounted vane first'
      : uneven.length > 0
        ? 'part of it may come from the controller, which waits longer on one side than on the other, and not from the vane'
        : 'the zero mark of the vane or the offset in the controller, since its neighbours of the same model do not share it'
  return {
    weight: 76,
    text: `The turbine stands off the wind by ${signed(standing)} degrees${constant}: ${what}.`,
    evidence: [
      `standing misalignment ${signed(standing)} degrees: ${sheet.reason}`,
      ...[...uneven, ...response].map(said),
    ],
    wouldSettle: [
      READ_PARAMETER,
      PHOTOGRAPH,
      'Then the zero mark of the vane against the axis of the nacelle.',
    ],
    findings: uneven,
  }
}

function twoVanes({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, ['two-vanes-apart'])
  if (findings.length === 0) return null
  const moved = sheet.staticOffset.changes.some(({ seenIn }) => seenIn === 'both' || seenIn === 'power')
  return explain(
    72,
    moved
      ? 'The two vanes no longer agree, and power says that it is the one the controller goes by that moved.'
      : 'The two vanes no longer agree. Power does not show that the one the controller goes by has moved, so the other is the likelier.',
    findings,
    ['At the desk: which of the vanes the controller uses, and the difference of both over time.'],
  )
}

function vaneStill({ sheet }: RuleInput): Explanation | null {
  const iced = pick(sheet, ({ sensor, kind }) => sensor === 'vane' && kind === 'icing')
  const frozen = pick(sheet, ({ sensor, kind }) => sensor === 'vane' && kind === 'frozen')
  const own = [...iced, ...frozen]
  if (own.length === 0) return null
  const along = pick(
    sheet,
    (finding) =>
      finding.sensor === 'anemometer' &&
      (finding.kind === 'icing' || finding.kind === 'frozen') &&
      own.some((one) => overlap(one, finding)),
  )
  const parts: string[] = []
  if (iced.length > 0) {
    const also = along.some(({ kind }) => kind === 'icing') ? ', and the anemometer with it' : ''
    parts.push(
      `Ice: the vane stood still in the cold ${spells(iced)}${also}. It thaws by itself; what may need work is the heating.`,
    )
  }
  if (frozen.length > 0) {
    const both = along.some(({ kind }) => kind === 'frozen')
    parts.push(
      both
        ? `Vane and anemometer stood still together ${spells(frozen)} without cold: the logger or the line held its last values, not two sensors at once.`
        : `The vane stood still ${spells(frozen)} without cold: its bearing, its transducer or its plug. While it stands the controller does not follow the wind.`,
    )
  }
  return explain(70, parts.join(' '), [...own, ...along])
}

function vaneQuality({ sheet }: RuleInput): Explanation | null {
  const findings = pick(sheet, ({ sensor, kind }) => sensor === 'vane' && VANE_QUALITY.includes(kind))
  if (findings.length === 0) return null
  const kinds = new Set(findings.map(({ kind }) => kind))
  const what =
    kinds.has('dead-sector') || kinds.has('stuck-bit')
      ? 'the transducer of the vane is damaged (a potentiometer at its gap, or a track of an encoder): readings near the places named are wrong, the others are not'
      : kinds.has('noise-changed')
        ? 'the vane itself has changed, in its bearing, its damping or its make'
        : kinds.has('spikes')
          ? 'the signal is disturbed on its way: plug, screen or lightning damage rather than the vane'
          : 'the vane is read more coarsely than it could be: a setting of the logger, or another transducer'
  return explain(66, `Vane: ${what}.`, findings)
}

function idleBias({ sheet }: RuleInput): Explanation | null {
  const findings = ofKinds(sheet, ['idle-bias'])
  if (findings.length === 0) return null
  return explain(
    40,
    'The vane reads otherwise while the rotor idles than while it runs: the swirl behind the turning rotor. What counts is the running turbine, and this estimate is of that; a vane must not be aligned by how it reads at standstill.',
    findings,
  )
}
