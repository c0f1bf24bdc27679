import type * as z from 'zod';
import type { Services } from './services';

/**
 * Holds an answer against its contract. Outside production a difference is an error; in production what the contract
 * does not name is left out, so that nothing leaks, and any other difference is logged.
 */
export function checkedResponse(schema: z.ZodType, value: unknown, services: Pick<Services, 'config' | 'log'>): unknown {
  const parsed = schema.safeParse(value);
  if (parsed.success) return parsed.data;
  if (services.config.mode !== 'production') throw new Error(`an answer differs from its contract: ${parsed.error.message}`);
  services.log.error({ issues: parsed.error.issues.slice(0, 10) }, 'an answer differs from its contract');
  const copy: unknown = structuredClone(value);
  for (const issue of parsed.error.issues)
    if (issue.code === 'unrecognized_keys') for (const key of issue.keys) removeAt(copy, issue.path, key);
  return copy;
}

function removeAt(root: unknown, path: readonly PropertyKey[], key: string): void {
  const holder = path.reduce<unknown>(
    (value, part) => (typeof value === 'object' && value !== null ? (value as Record<PropertyKey, unknown>)[part] : undefined),
    root,
  );
  if (typeof holder === 'object' && holder !== null) Reflect.deleteProperty(holder, key);
}
