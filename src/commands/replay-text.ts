import type { RunReport } from './run-report.ts'

const mostFindingLines = 20

/** What a person reads behind a replay. */
export function replayText(report: RunReport): string {
  const { summary, shifts, sentences, findings, warnings, cautions } = report
  const lines: string[] = []
  const rate = summary.seconds > 0 ? summary.readings / summary.seconds : 0
  lines.push(
    `${grouped(summary.readings)} readings, ${grouped(summary.frames)} frames in ${summary.seconds.toFixed(2)} s (${grouped(Math.round(rate))} readings/s).`,
  )
  const drops = Object.entries(summary.dropped)
  lines.push(
    drops.length === 0
      ? 'Nothing was dropped.'
      : `Dropped: ${drops.map(([reason, count]) => `${grouped(count)} ${reason}`).join(', ')}.`,
  )
  lines.push(
    '',
    shifts.length === 0
      ? 'No regime shifted.'
      : `${shifts.length} ${shifts.length === 1 ? 'shift' : 'shifts'}:`,
  )
  for (const [k, shift] of shifts.entries()) lines.push(`  ${shift.confirmed}  ${sentences[k]}`)
  if (findings.length > 0) {
    lines.push('', `${summary.findings} findings about signals:`)
    for (const { ensemble, signal, finding, from, to } of findings.slice(0, mostFindingLines)) {
      lines.push(
        `  ${from}  ${ensemble}: ${signal ?? 'all signals'} ${finding}${to === null ? '' : `, until ${to}`}`,
      )
    }
    if (findings.length > mostFindingLines)
      lines.push(`  … (${findings.length - mostFindingLines} more with --report or --json)`)
  }
  for (const warning of warnings) lines.push('', warning)
  lines.push('', ...cautions)
  return `${lines.join('\n')}\n`
}

const grouped = (count: number): string => count.toLocaleString('en')
