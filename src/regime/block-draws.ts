import { Random } from './random.ts'

/**
 * Frames drawn in whole blocks around a circle, so that neighbours keep their memory and every frame its
 * cross-section (circular blocks of Politis & Romano 1992; without replacement their subsampling of 1994).
 */

/** A tenth of the window, no less than the cube root of the frames (the rate of Hall, Horowitz & Jing 1995). */
export const blockLength = (frames: number, span: number): number =>
  Math.max(1, Math.min(Math.floor(frames / 2), Math.max(Math.ceil(span / 10), Math.ceil(Math.cbrt(frames)))))

/** `wanted` of the rows 0 … frames−1, no row twice; wanted ≤ frames. */
export function drawWithout(random: Random, frames: number, wanted: number, block: number): Int32Array {
  const offset = random.below(frames)
  const blocks = Int32Array.from({ length: Math.ceil(frames / block) }, (_, k) => k)
  const out = new Int32Array(wanted)
  let have = 0
  for (let k = 0; k < blocks.length && have < wanted; k++) {
    const pick = k + random.below(blocks.length - k)
    const chosen = blocks[pick]!
    blocks[pick] = blocks[k]!
    const end = Math.min(frames, (chosen + 1) * block)
    for (let row = chosen * block; row < end && have < wanted; row++) out[have++] = (row + offset) % frames
  }
  return out
}

/** `wanted` of the rows 0 … frames−1, blocks with replacement. */
export function drawWith(random: Random, frames: number, wanted: number, block: number): Int32Array {
  const out = new Int32Array(wanted)
  let have = 0
  while (have < wanted) {
    const start = random.below(frames)
    for (let k = 0; k < block && have < wanted; k++) out[have++] = (start + k) % frames
  }
  return out
}

export function randomFrom(state: Uint32Array): Random {
  const random = new Random(0)
  random.state.set(state)
  return random
}
