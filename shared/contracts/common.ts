import * as z from 'zod';

export const idSchema = z.string().min(1).max(64);
/** ISO 8601 UTC with `Z`. */
export const instantSchema = z.iso.datetime();

/** One page of a list: `next` is the cursor of the following page (also in the Link header, RFC 8288), null on the last. */
export const pageOf = <T extends z.ZodType>(item: T) => z.strictObject({ items: z.array(item), next: z.string().nullable() });

export const pageQuerySchema = z.strictObject({
  cursor: z.string().optional(),
  limit: z.coerce.number().int().min(1).max(500).default(50),
});
