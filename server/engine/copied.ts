/** A deep copy of plain data, some times faster than `structuredClone` where it is small. */
export function copied<T>(value: T): T {
  if (typeof value !== 'object' || value === null) return value;
  if (Array.isArray(value)) return value.map((item: unknown) => copied(item)) as T;
  const copy: Record<string, unknown> = {};
  for (const name in value) copy[name] = copied((value as Record<string, unknown>)[name]);
  return copy as T;
}
