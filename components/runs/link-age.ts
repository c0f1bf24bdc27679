import type { LiveMessages } from '@/shared/contracts/runs';

/** How old the newest word from the rig is. Two legs can be silent: server to page, and controller to server. */
export interface LinkAge {
  grade: 'live' | 'stale' | 'lost';
  /** Seconds since the last word; null when there was none yet. */
  ageS: number | null;
  /** Which leg is silent: `page` (nothing from the server), `rig` (the server hears nothing from the controller). */
  silent: 'page' | 'rig' | null;
}

const liveS = 2;
const staleS = 5;

interface Heard {
  nowMs: number;
  /** Device time of the last message from the server. */
  heardAtMs: number | null;
  beat: LiveMessages['beat'] | null;
  /** A rehearsal has no controller behind it. */
  hasController: boolean;
}

/** Live up to 2 s, stale up to 5 s, lost beyond; the older leg counts. */
export function linkAge({ nowMs, heardAtMs, beat, hasController }: Heard): LinkAge {
  if (heardAtMs === null) return { grade: 'stale', ageS: null, silent: 'page' };
  const pageAgeS = Math.max(0, (nowMs - heardAtMs) / 1000);
  if (!hasController || beat === null) return { grade: gradeOf(pageAgeS), ageS: pageAgeS, silent: pageAgeS > liveS ? 'page' : null };
  const replyAgeS = beat.lastReplyAt === null ? null : Math.max(0, (Date.parse(beat.serverAt) - Date.parse(beat.lastReplyAt)) / 1000);
  const rigAgeS = replyAgeS === null ? null : replyAgeS + pageAgeS;
  if (pageAgeS > liveS) return { grade: gradeOf(pageAgeS), ageS: rigAgeS ?? pageAgeS, silent: 'page' };
  if (beat.link !== 'ready') return { grade: 'lost', ageS: rigAgeS, silent: 'rig' };
  const ageS = rigAgeS ?? pageAgeS;
  return { grade: gradeOf(ageS), ageS, silent: ageS > liveS ? 'rig' : null };
}

const gradeOf = (ageS: number): LinkAge['grade'] => (ageS <= liveS ? 'live' : ageS <= staleS ? 'stale' : 'lost');
