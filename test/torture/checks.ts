/** What was looked at, how often, and what it came to. */
export interface Checks {
  /** Counts a look; a violation is printed at once, and the last detail in the summary. */
  expect(name: string, isKept: boolean, detail?: string): void
  note(text: string): void
  /** One line for each check. True when none was violated. */
  summary(): boolean
}

export function createChecks(print: (line: string) => void): Checks {
  const seen = new Map<string, { looks: number; violations: number; detail: string }>()
  return {
    expect(name, isKept, detail = '') {
      const check = seen.get(name) ?? { looks: 0, violations: 0, detail: '' }
      seen.set(name, check)
      check.looks++
      check.detail = detail
      if (isKept) return
      check.violations++
      print(`  VIOLATED: ${name}: ${detail}`)
    },
    note: (text) => {
      print(`  ${text}`)
    },
    summary() {
      for (const [name, { looks, violations, detail }] of seen) {
        print(`${violations === 0 ? 'ok  ' : 'FAIL'} ${name}: ${violations} of ${looks} violated; ${detail}`)
      }
      return seen.size > 0 && [...seen.values()].every(({ violations }) => violations === 0)
    },
  }
}
