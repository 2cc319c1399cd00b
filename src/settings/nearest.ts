/**
 * Number of letters to insert, leave out, change or swap with their neighbour to turn one word into the
 * other (optimal string alignment; Damerau 1964, Levenshtein 1966).
 */
function editDistance(a: string, b: string): number {
  let beforeLast: number[] = []
  let last = Array.from({ length: b.length + 1 }, (_, j) => j)
  for (let i = 1; i <= a.length; i++) {
    const row = [i]
    for (let j = 1; j <= b.length; j++) {
      const same = a[i - 1] === b[j - 1]
      let least = Math.min(last[j]! + 1, row[j - 1]! + 1, last[j - 1]! + (same ? 0 : 1))
      if (i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1])
        least = Math.min(least, beforeLast[j - 2]! + 1)
      row.push(least)
    }
    beforeLast = last
    last = row
  }
  return last[b.length]!
}

/** Longest word that is compared letter by letter. */
const longest = 80

/** The known word that was most likely meant, or null where none is near. Case and -, _ do not count. */
export function nearest(word: string, known: Iterable<string>): string | null {
  if (word.length > longest) return null
  const bare = (text: string) => text.toLowerCase().replaceAll(/[-_ ]/g, '')
  const meant = bare(word)
  let best: string | null = null
  let least = Math.max(1, Math.ceil(meant.length / 3)) + 1
  for (const candidate of known) {
    const other = bare(candidate)
    if (other.length > longest) continue
    const isBeginning = meant.length >= 3 && other.startsWith(meant)
    const distance = isBeginning ? 1 : editDistance(meant, other)
    if (distance < least && distance < Math.max(meant.length, other.length)) {
      best = candidate
      least = distance
    }
  }
  return best
}
