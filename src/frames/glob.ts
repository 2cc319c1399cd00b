/**
 * Does the text match the glob? `*` stands for any run of characters, `?` for one (a code point). A failure
 * goes back to the last star only, so that time is at most the product of the two lengths, and linear in the
 * text where no star is followed by a text that nearly fits everywhere.
 */
export function matchesGlob(glob: string, text: string): boolean {
  const pattern = Array.from(glob)
  const letters = Array.from(text)
  let g = 0
  let t = 0
  let star = -1
  let resume = 0
  while (t < letters.length) {
    if (g < pattern.length && pattern[g] === '*') {
      star = g++
      resume = t
    } else if (g < pattern.length && (pattern[g] === '?' || pattern[g] === letters[t])) {
      g++
      t++
    } else if (star >= 0) {
      g = star + 1
      t = ++resume
    } else return false
  }
  while (g < pattern.length && pattern[g] === '*') g++
  return g === pattern.length
}
