/** What always stands at the foot of the page; the same words as in every alert and heartbeat. */
export const pageCautions: readonly string[] = [
  'Correlation is not cause: the monitor sees that signals move together differently, not why.',
  'This is advice to a trained person. It is no safety function and replaces no protection layer, no alarm that a code requires and no licensed judgement.',
  'It is no investment advice.',
  'A quiet monitor is no evidence of a safe plant; a missing heartbeat means that nobody is watching.',
]
