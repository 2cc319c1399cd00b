import { readFileSync } from 'node:fs'
import { composeEnsemble, type EnsembleFiles } from '../compose.ts'
import type { Ensemble } from '../ensemble.ts'
import { TautlineError } from '../errors.ts'
import { readReference } from '../regime/reference-record.ts'
import type { EnsembleSettings, Settings } from '../settings/schema.ts'

/** Composes every ensemble of the settings, reading the files that they name. @throws TautlineError */
export function openEnsembles(settings: Settings): Ensemble[] {
  return Object.entries(settings.ensembles).map(([name, ensemble]) => {
    const composed = composeEnsemble(name, ensemble, filesOf(ensemble))
    if (!composed.ok) throw composed.error
    return composed.value
  })
}

function filesOf({ signals, reference }: EnsembleSettings): EnsembleFiles {
  return {
    ...('file' in signals ? { signals: namesOf(signals.file) } : {}),
    ...('from' in reference ? { reference: referenceOf(reference.from) } : {}),
  }
}

function namesOf(path: string): readonly string[] {
  const names = textOf(path)
    .split(/\r?\n/)
    .map((line) => line.trim())
    .filter((line) => line !== '')
  if (new Set(names).size < 2)
    throw new TautlineError('signals-unreadable', `${path} names fewer than two signals.`)
  return [...new Set(names)]
}

function referenceOf(path: string) {
  let json: unknown
  try {
    json = JSON.parse(textOf(path))
  } catch (error) {
    if (error instanceof TautlineError) throw error
    throw new TautlineError('reference-unreadable', `${path} is no JSON.`)
  }
  const read = readReference(json)
  if (!read.ok) throw read.error
  return read.value
}

function textOf(path: string): string {
  try {
    return readFileSync(path, 'utf8')
  } catch (error) {
    throw new TautlineError('signals-unreadable', `${path}: ${(error as NodeJS.ErrnoException).code}.`)
  }
}
