import type { Step } from '../protocol/document';
import { isCalm, isChannelWait, waitOf, type CalmStep } from '../protocol/wait';
import type { RigDocument } from '../rig/document';
import { channelReadings } from './channel-condition';
import { fitFreeSwing } from './free-swing';
import { longestSilenceS, type Reading, type Series } from './series';

/** Whether what a settle until calm or a wait for a channel asks for is met. */

export interface WaitLook {
  rig: RigDocument;
  angleDeg: number;
  /** The step began here. */
  sinceUtcMs: number;
  nowUtcMs: number;
  /** Of the last window; null where nothing ever came into the channel. */
  series: Series | null;
}

export interface WaitFinding {
  met: boolean;
  readings: Reading[];
  /** `filling`: the step has not lasted a window yet; `silent`: samples are missing. */
  samples: 'there' | 'filling' | 'silent';
}

/** A window with a longer pause tells nothing, s; of a slow channel, so many intervals. */
const MOST_PAUSE_S = 15;
const MOST_PAUSE_INTERVALS = 3;

export function lookAtWait(step: Step, look: WaitLook): WaitFinding {
  const wait = waitOf(step);
  const { series, nowUtcMs, sinceUtcMs } = look;
  if (wait === null || series === null || series.utcMs.length === 0) return { met: false, readings: [], samples: 'silent' };
  const fromUtcMs = Math.max(sinceUtcMs, nowUtcMs - 1000 * wait.windowS);
  const filling = nowUtcMs - sinceUtcMs < 1000 * wait.windowS - 1;
  const silent =
    longestSilenceS(series, { fromUtcMs, toUtcMs: nowUtcMs }) > Math.max(MOST_PAUSE_S, MOST_PAUSE_INTERVALS / (series.rateHz ?? 1));
  const readings = isCalm(step) ? calmReadings(step, look) : isChannelWait(step) ? channelReadings(step.until, series) : [];
  const met = !filling && !silent && readings.length > 0 && readings.every((reading) => reading.met);
  return { met, readings, samples: silent ? 'silent' : filling ? 'filling' : 'there' };
}

function calmReadings({ calmWhen }: CalmStep, { rig, angleDeg, series, nowUtcMs, sinceUtcMs }: WaitLook): Reading[] {
  const fromUtcMs = Math.max(sinceUtcMs, nowUtcMs - 1000 * calmWhen.window_s);
  const swing = fitFreeSwing(rig, series, { fromUtcMs, toUtcMs: nowUtcMs, angleDeg });
  const reading = (name: string, rad: number | undefined, of: { limit: number | undefined; unit: string }): Reading[] => {
    if (of.limit === undefined) return [];
    const value = rad === undefined ? null : 1e6 * Math.abs(rad);
    return [{ name, value, limit: of.limit, wanted: 'below', unit: of.unit, met: value !== null && value < of.limit }];
  };
  return [
    ...reading('amplitude', swing?.amplitudeRad, { limit: calmWhen.amplitude_urad, unit: 'µrad' }),
    ...reading('drift', swing?.driftRadPerH, { limit: calmWhen.drift_urad_per_h, unit: 'µrad/h' }),
  ];
}
