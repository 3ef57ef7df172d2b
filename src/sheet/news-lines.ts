import type { WhatIsNew } from './trend.ts'

/** What is new since the last replay, as a person reads it; unwrapped, one line each. Empty when there is nothing to tell. */
export function newsLines(news: WhatIsNew): string[] {
  return [
    ...news.corrections.map(
      ({ turbine, at, from, to }) =>
        `${turbine}: the correction of ${at.slice(0, 16).replace('T', ' ')} UTC is judged "${to}"${from === null ? '' : `, "${from}" before`}`,
    ),
    ...news.verdicts.map(
      ({ turbine, from, to, reason }) =>
        `${turbine}: ${to}, ${from === null ? 'not scored' : from} before: ${reason}`,
    ),
    ...news.moved.map(({ turbine, fromDeg, toDeg, changeDeg, interval95Deg: [low = null, high = null] }) => {
      const interval = low === null || high === null ? '' : ` [${signed(low)}, ${signed(high)}]`
      return `${turbine}: m moved from ${signed(fromDeg)} to ${signed(toDeg)} degrees, by ${signed(changeDeg)}${interval}: more than chance`
    }),
    ...news.findings.map(({ turbine, sensor, finding }) => `${turbine}: new at the ${sensor}: ${finding}`),
    ...news.gone.map(({ turbine, sensor, kind }) => `${turbine}: no longer found at the ${sensor}: ${kind}`),
    ...news.missing.map((turbine) => `${turbine}: scored before, not in this replay`),
  ]
}

function signed(value: number): string {
  const text = value.toFixed(1)
  return Number(text) === 0 ? '0.0' : value > 0 ? `+${text}` : text
}
