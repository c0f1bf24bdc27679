import * as z from 'zod';

/**
 * What becomes of the offset between the channel's clock and the step log's: the estimated one is taken off where it is told well enough (the default),
 * nothing is taken off, or what is known from elsewhere is, s (channel minus log).
 */
export const clockChoiceSchema = z.discriminatedUnion('kind', [
  z.strictObject({ kind: z.literal('estimated') }),
  z.strictObject({ kind: z.literal('left') }),
  z.strictObject({ kind: z.literal('set'), offset_s: z.number().min(-86_400).max(86_400) }),
]);
export type ClockChoice = z.infer<typeof clockChoiceSchema>;
