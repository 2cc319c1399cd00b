/** Shortest value that is looked for in texts; a shorter one would blot out ordinary words. */
const shortest = 4

/** The secrets of this run, so that no log line, page or error shows one. */
export class Secrets {
  #spellings: readonly string[] = []

  /** Remembers a secret, with the spellings it takes in JSON, in addresses and in basic authentication. */
  add(secret: string): void {
    if (secret.length < shortest) return
    const spellings = [
      secret,
      JSON.stringify(secret).slice(1, -1),
      encodeURIComponent(secret),
      Buffer.from(secret).toString('base64'),
    ]
    this.#spellings = [...new Set([...this.#spellings, ...spellings])].sort((a, b) => b.length - a.length)
  }

  /** The text with every secret replaced by `[hidden]`. */
  redact(text: string): string {
    let shown = text
    for (const spelling of this.#spellings) shown = shown.replaceAll(spelling, '[hidden]')
    return shown
  }
}
