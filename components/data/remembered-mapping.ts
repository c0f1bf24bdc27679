import { importMappingSchema, type ImportMapping } from '@/shared/contracts/data';
import * as z from 'zod';

/** How the last file of a lab was read on this device: the next one of the same make is usually alike. */

export type MappingKey = keyof ImportMapping;

const rememberedSchema = z.strictObject({ columns: z.array(z.string()), mapping: importMappingSchema.omit({ elapsedFrom: true }) });
export type RememberedMapping = z.infer<typeof rememberedSchema>;

const keyOf = (labId: string) => `evenfall.import.${labId}`;

/** The remembered mapping; null where there is none, it is of another version, or the browser refuses storage. */
export function readRemembered(labId: string): RememberedMapping | null {
  try {
    const text = window.localStorage.getItem(keyOf(labId));
    const parsed = text === null ? null : rememberedSchema.safeParse(JSON.parse(text));
    return parsed?.success ? parsed.data : null;
  } catch {
    return null;
  }
}

export function remember(labId: string, columns: readonly string[], { elapsedFrom: _, ...mapping }: ImportMapping): void {
  try {
    window.localStorage.setItem(keyOf(labId), JSON.stringify({ columns, mapping }));
  } catch {
    return;
  }
}
