const longest = 200

const asCode = (unit: string): string => {
  const code = unit.charCodeAt(0)
  return code < 256 ? `\\x${code.toString(16).padStart(2, '0')}` : `\\u${code.toString(16).padStart(4, '0')}`
}

/** Control characters (C0, C1, DEL), lone surrogates, line separators, marks of writing direction and U+FEFF as codes. */
export const escapeText = (text: string): string =>
  text
    .replace(/\\/g, '\\\\')
    .replace(/[\u0000-\u001f\u007f-\u009f\u2028-\u202e\u2066-\u2069\ufeff]|\p{Surrogate}/gu, asCode)

/** The first bytes of `bytes[from, to)`, at most 200, as text; what is no UTF-8 becomes U+FFFD. */
export function firstBytes(bytes: Uint8Array, from: number, to: number): string {
  const end = Math.min(to, from + longest)
  return escapeText(
    Buffer.from(bytes.buffer, bytes.byteOffset + from, Math.max(0, end - from)).toString('utf8'),
  )
}
