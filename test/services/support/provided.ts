/** What the set-up hands to the tests: `inject('kafka')` and so on. Plain data, as vitest asks. */

/** How tests start brokers of their own (`KafkaBroker`). */
export type KafkaTools =
  | { readonly by: 'java'; readonly java: string; readonly jars: string }
  | { readonly by: 'container'; readonly image: string }
  | { readonly by: 'none'; readonly missing: string }

export interface PrometheusPrograms {
  readonly prometheus: string
  readonly promtool: string
}

declare module 'vitest' {
  interface ProvidedContext {
    /** Bootstrap address, `host:port`, of a broker that all tests share: use topics of your own. */
    kafka: string
    kafkaTools: KafkaTools
    prometheus: PrometheusPrograms
    /** The program, for instances of one's own, and the address of one that all tests share. */
    alertmanager: { readonly program: string; readonly url: string }
    /** Path of the browser's program. */
    chromium: string
  }
}
