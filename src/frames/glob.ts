/**
 * Does the text match the glob? `*` stands for any run of characters, `?` for one. Time is at most the
 * product of the two lengths: the last star alone is ever gone back to.
 */
export function matchesGlob(glob: string, text: string): boolean {
  let g = 0
  let t = 0
  let star = -1
  let resume = 0
  while (t < text.length) {
    if (g < glob.length && (glob[g] === '?' || (glob[g] === text[t] && glob[g] !== '*'))) {
      g++
      t++
    } else if (g < glob.length && glob[g] === '*') {
      star = g++
      resume = t
    } else if (star >= 0) {
      g = star + 1
      t = ++resume
    } else return false
  }
  while (g < glob.length && glob[g] === '*') g++
  return g === glob.length
}
