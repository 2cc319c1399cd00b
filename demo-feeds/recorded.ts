import type { DemoChunk } from './demo-feed.ts'

export const recordedFormats = ['ndjson', 'csv-long', 'csv-wide'] as const
export type RecordedFormat = (typeof recordedFormats)[number]

/** `{"signal":…,"time":…,"value":…}`, time in milliseconds since 1970 UTC. */
export const readingJson = (chunk: DemoChunk, i: number): string =>
  `{"signal":"${chunk.names[chunk.signal[i]!]}","time":${chunk.time[i]},"value":${chunk.value[i]}}`

function* ndjson(chunks: Iterable<DemoChunk>): Generator<string> {
  for (const chunk of chunks) {
    let text = ''
    for (let i = 0; i < chunk.count; i++) text += `${readingJson(chunk, i)}\n`
    yield text
  }
}

function* csvLong(chunks: Iterable<DemoChunk>): Generator<string> {
  yield 'time,signal,value\n'
  for (const { count, names, signal, time, value } of chunks) {
    let text = ''
    for (let i = 0; i < count; i++) text += `${time[i]},${names[signal[i]!]},${value[i]}\n`
    yield text
  }
}

/** One row a span: its end and the last value of each signal that has arrived by then, empty before the first. */
function* csvWide(chunks: Iterable<DemoChunk>): Generator<string> {
  let last: string[] | null = null
  const lastTime: number[] = []
  for (const { until, count, names, signal, time, value } of chunks) {
    if (!last) {
      last = names.map(() => '')
      yield `time,${names.join(',')}\n`
    }
    for (let i = 0; i < count; i++) {
      const j = signal[i]!
      if (time[i]! < (lastTime[j] ?? Number.NEGATIVE_INFINITY)) continue
      lastTime[j] = time[i]!
      last[j] = String(value[i])
    }
    yield `${new Date(until).toISOString()},${last.join(',')}\n`
  }
}

/** The readings as the text of a recorded file, piece by piece. */
export function recorded(chunks: Iterable<DemoChunk>, format: RecordedFormat): Generator<string> {
  switch (format) {
    case 'ndjson':
      return ndjson(chunks)
    case 'csv-long':
      return csvLong(chunks)
    case 'csv-wide':
      return csvWide(chunks)
  }
}
