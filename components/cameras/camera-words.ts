import type { CameraView, FrameMoment, FrameView } from '@/shared/contracts/cameras';
import { formatAgo } from '@/shared/lib/format-duration';
import { formatClock } from '@/shared/lib/format-time';

export const momentWords: Readonly<Record<FrameMoment, string>> = {
  mark: 'At the mark',
  'swing-began': 'The swing began',
  'swing-ended': 'The swing ended',
};

export const kindWords: Readonly<Record<CameraView['kind'], string>> = {
  drawn: 'The simulated rig, drawn as it truly stands',
  address: 'Asked for a picture at its address',
  pushed: 'Sends its pictures with a token',
};

interface Now {
  timeZone: string;
  nowMs: number;
}

/** When the newest picture was taken, and what became of the one asked for last. */
export function pictureWords({ takenAt, kind }: CameraView, { timeZone, nowMs }: Now): string {
  if (takenAt === null) return kind === 'pushed' ? 'No picture was sent yet.' : 'No picture yet; it is asked for one now.';
  const takenMs = Date.parse(takenAt);
  return `Taken ${formatClock(takenMs, { timeZone, precision: 'seconds' })}, ${formatAgo((nowMs - takenMs) / 1000)}`;
}

export const troubleWords = ({ status }: CameraView): string | null =>
  status === null || status.reason === null ? null : `The last picture did not come: ${status.reason}.`;

/** From here on a picture was taken later than its moment by more than the eye forgives, s. */
const lateS = 2;

/** What a frame shows and when it was taken. */
export function frameWords({ camera, moment, at, picture }: FrameView, timeZone: string): string {
  const late = picture === null ? 0 : (Date.parse(picture.takenAt) - Date.parse(at)) / 1000;
  const clock = formatClock(Date.parse(at), { timeZone, precision: 'seconds' });
  const lateness = late > lateS ? `, taken ${String(Math.round(late))} s later` : '';
  return `${momentWords[moment]}, ${clock}, ${camera}${lateness}`;
}
