import { serverNowMs } from '@/components/api';
import type { Tone } from '@/components/ui';
import { linkSettingsSchema, type LinkSettings, type RigLive } from '@/shared/contracts/rigs';
import { formatAgo } from '@/shared/lib/format-duration';

export interface LinkState {
  words: string;
  tone: Tone;
}

const ageS = (live: RigLive): number | null =>
  live.lastReplyAt === null ? null : Math.max(0, (serverNowMs() - Date.parse(live.lastReplyAt)) / 1000);

/** The link in two words for a chip; the age is that of the controller's last valid reply. */
export function linkState(live: RigLive): LinkState {
  const age = ageS(live);
  switch (live.condition) {
    case 'ready':
      return age !== null && age > 5 ? { words: `last reply ${formatAgo(age)}`, tone: 'lamp' } : { words: 'live', tone: 'good' };
    case 'opening':
      return { words: 'opening', tone: 'lamp' };
    case 'lost':
      return { words: age === null ? 'link lost' : `lost, last reply ${formatAgo(age)}`, tone: 'danger' };
    case 'refused':
      return { words: 'refused', tone: 'danger' };
    case 'closed':
      return { words: 'link closed', tone: 'dim' };
  }
}

export function linkName(link: LinkSettings): string {
  if (link.kind === 'simulated') return 'Simulated controller';
  if (link.kind === 'board') return 'Emulated controller board';
  return link.kind === 'serial' ? `${link.path}, ${link.baudRate} baud` : `${link.host}, port ${link.port}`;
}

/** What would be right, by field; empty where the server would take the link as it is. */
export function wrongFields(link: LinkSettings): Record<string, string> {
  const found: Record<string, string> = {};
  for (const { path, message } of linkSettingsSchema.safeParse(link).error?.issues ?? []) found[path.join('.')] ??= message;
  return found;
}
