import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { matchesGlob } from '../../src/frames/glob.ts'
import { overLimit, Roster, unwatched } from '../../src/frames/roster.ts'

/** The definition itself, by recursion over code points. */
function fits(glob: readonly string[], text: readonly string[]): boolean {
  const [first, ...rest] = glob
  if (first === undefined) return text.length === 0
  if (first === '*') return fits(rest, text) || (text.length > 0 && fits(glob, text.slice(1)))
  return text.length > 0 && (first === '?' || first === text[0]) && fits(rest, text.slice(1))
}

describe('glob', () => {
  test('a star is any run of characters, a question mark one, all else itself', () => {
    expect(matchesGlob('PT-*', 'PT-103')).toBe(true)
    expect(matchesGlob('PT-*', 'PT-')).toBe(true)
    expect(matchesGlob('PT-*', 'FT-103')).toBe(false)
    expect(matchesGlob('PT-?', 'PT-1')).toBe(true)
    expect(matchesGlob('PT-?', 'PT-')).toBe(false)
    expect(matchesGlob('PT-?', 'PT-🌊')).toBe(true)
    expect(matchesGlob('a.[b]$', 'a.[b]$')).toBe(true)
    expect(matchesGlob('a*', '*')).toBe(false)
    expect(matchesGlob('*', '')).toBe(true)
    expect(matchesGlob('', '')).toBe(true)
  })

  test('agrees with its definition', () => {
    const glob = fc.array(fc.constantFrom('a', 'b', '*', '?'), { maxLength: 8 })
    const text = fc.array(fc.constantFrom('a', 'b', '*'), { maxLength: 10 })
    fc.assert(
      fc.property(glob, text, (glob, text) => {
        expect(matchesGlob(glob.join(''), text.join(''))).toBe(fits(glob, text))
      }),
      { numRuns: 500, seed: 5 },
    )
  })

  test('does not try all ways of dividing a text among many stars', () => {
    // A matcher that goes back over all stars needs about C(500, 50) tries here and would never end.
    expect(matchesGlob(`${'*a'.repeat(50)}*b`, 'a'.repeat(500))).toBe(false)
  })
})

describe('roster', () => {
  test('an explicit list has its order from the start and nothing else', () => {
    const roster = new Roster({ names: ['b', 'a'] })
    expect(roster.names).toEqual(['b', 'a'])
    expect(roster.place('a')).toBe(1)
    expect(roster.place('c')).toBe(unwatched)
  })

  test('a pattern takes in signals up to its limit', () => {
    const roster = new Roster({ pattern: 'x*', limit: 2 })
    expect(['x3', 'y', 'x1', 'x2', 'x3'].map((name) => roster.place(name))).toEqual([
      0,
      unwatched,
      1,
      overLimit,
      0,
    ])
    expect(roster.names).toEqual([])
  })

  test('signals of one frame are numbered by name, of later frames behind them', () => {
    const roster = new Roster({ pattern: '*', limit: 10 })
    const places = ['c', 'a', 'd', 'b'].map((name) => roster.place(name))
    roster.enrol([places[0]!, places[1]!])
    roster.enrol([places[2]!, places[3]!])
    expect(roster.names).toEqual(['a', 'c', 'b', 'd'])
    expect(roster.names.map((_, i) => roster.nameOf(roster.placeAt(i)))).toEqual(roster.names)
  })

  test('goes on from a snapshot, signals that no frame has held yet included', () => {
    const roster = new Roster({ pattern: '*', limit: 3 })
    roster.place('z')
    roster.enrol([roster.place('m')])
    const other = new Roster({ pattern: '*', limit: 3 })
    other.restore(structuredClone(roster.snapshot()))
    expect(other.names).toEqual(['m'])
    expect(other.place('z')).toBe(0)
    expect(other.index(0)).toBe(-1)
    other.enrol([0])
    expect(other.names).toEqual(['m', 'z'])
    expect(other.place('a')).toBe(2)
    expect(other.place('b')).toBe(overLimit)
  })
})
