import type { ImportMapping } from '@/shared/contracts/data';
import type { RememberedMapping } from '@/shared/contracts/import-files';

export type MappingKey = keyof ImportMapping;

/** How a file of the same columns was read into a channel of the rig: the one of that name, else the last one; null where there is none. */
export function fittingMapping(
  remembered: readonly RememberedMapping[],
  { columns, channelName }: { columns: readonly string[]; channelName: string },
): RememberedMapping | null {
  const same = remembered.filter(
    (one) => one.columns.length === columns.length && one.columns.every((name, index) => name === columns[index]),
  );
  return same.find((one) => one.channelName === channelName) ?? same[0] ?? null;
}
