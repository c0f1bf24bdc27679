import { formatDuration } from '../lib/format-duration';
import { formatPercent, formatSignificant, NARROW_SPACE } from '../lib/format-number';
import type { SpotFigures, SpotHealth } from './health';

/** What whoever looks at the laptop should know before leaving it alone for a night, in sentences. */

export interface WatchedDevice {
  /** Null where the browser cannot keep the screen on. */
  awake: boolean | null;
  /** Null where the browser does not tell. */
  battery: { level: number; charging: boolean } | null;
  hidden: boolean;
}

export interface WarningFacts {
  health: SpotHealth;
  figures: SpotFigures;
  device: WatchedDevice;
  /** Whether pictures bear the moment they were taken, or only that of being shown. */
  stamped: 'capture' | 'shown';
  /** u of the server's time on this device, ms; null while it is not known. */
  clockUMs: number | null;
  /** This device's own clock minus the server's, ms. */
  clockErrorMs: number | null;
}

/** Above these a person is told; common practice, no source. */
const MOST = { clockUMs: 50, clockErrorMs: 2000, noiseOverU: 2, rateLoss: 0.7, missedShare: 0.05, saturated: 4 };
const LOW_BATTERY = 0.3;

const ms = (value: number) => `${formatSignificant(value, 2)}${NARROW_SPACE}ms`;

export function warningsOf(facts: WarningFacts): string[] {
  return [...ofLight(facts), ...ofFrames(facts), ...ofClock(facts), ...ofDevice(facts.device)];
}

const unreadWords = {
  dark: 'No spot stands out in the region. Light it, or draw the region where the spot is.',
  'at-border': 'The spot is cut off by the end of the region. Make the region longer, or move the camera.',
  'too-wide': 'The spot fills nearly the whole region, so that no background is left beside it. Make the region longer.',
};

function ofLight({ health, figures }: WarningFacts): string[] {
  const last = health.recent.at(-1);
  if (last === undefined) return [];
  const found: string[] = [];
  if (last.reading.kind === 'none') found.push(unreadWords[last.reading.why]);
  if (last.saturated >= MOST.saturated)
    found.push(
      `${last.saturated} pixels are saturated: the top of the spot is cut flat, and where it lies is known less well than is stated. Shorten the exposure or dim the spot.`,
    );
  if (last.reading.kind === 'spot' && last.reading.second)
    found.push(
      'Something else in the region is nearly as bright, perhaps the reflection from the window. Draw the region so that it holds one spot.',
    );
  const { noisePx, uPx } = figures;
  if (noisePx !== null && uPx !== null && noisePx > MOST.noiseOverU * uPx)
    found.push(
      `The spot scatters by ${formatSignificant(noisePx, 2)} px, ${formatSignificant(noisePx / uPx, 2)} times what the noise of the pictures explains: air, vibration, or a camera that compresses its pictures.`,
    );
  return found;
}

function ofFrames({ health, figures, stamped }: WarningFacts): string[] {
  const found: string[] = [];
  const { rateHz } = figures;
  if (health.frames > 0 && rateHz === 0) found.push('No picture has come for 2 s.');
  else if (rateHz > 0 && rateHz < MOST.rateLoss * health.bestRateHz)
    found.push(
      `The rate has fallen to ${formatSignificant(rateHz, 2)} of ${formatSignificant(health.bestRateHz, 2)} pictures a second: the browser holds this page back, or the camera exposes longer in the dark. Set its exposure by hand.`,
    );
  const share = health.frames === 0 ? 0 : health.missed / (health.frames + health.missed);
  if (share > MOST.missedShare)
    found.push(`${formatPercent(share)} of the pictures were missed: this device is busy, or the region is too large for it.`);
  if (health.frames > 0 && stamped === 'shown')
    found.push(
      'The camera does not tell when a picture was taken: samples bear the moment it was shown, late by one to three pictures. Set the clock offset of the evaluation.',
    );
  return found;
}

function ofClock({ clockUMs, clockErrorMs }: WarningFacts): string[] {
  const found: string[] = [];
  if (clockUMs === null) found.push('The time of the server is not known yet: nothing is kept until it answers.');
  else if (clockUMs > MOST.clockUMs)
    found.push(`The time of the server is known to ${ms(clockUMs)} only: the network is slow, or it has not answered for long.`);
  if (clockErrorMs !== null && Math.abs(clockErrorMs) > MOST.clockErrorMs)
    found.push(
      `The clock of this device is ${formatDuration(Math.abs(clockErrorMs) / 1000)} ${clockErrorMs > 0 ? 'ahead of' : 'behind'} the server's. Samples bear the server's time; set the clock (NTP) all the same.`,
    );
  return found;
}

/** What may end the work of a page whose camera works for a rig; `hiddenWords`: what ends when nobody sees it. */
export function ofDevice({ awake, battery, hidden }: WatchedDevice, hiddenWords = 'the browser reads no pictures'): string[] {
  const found: string[] = [];
  if (hidden) found.push(`This page is not seen: ${hiddenWords}. Bring it to the front and leave it there.`);
  if (awake === null) found.push('This browser cannot keep the device awake: switch its sleep off in the settings of the system.');
  else if (!awake) found.push('The device may fall asleep: the browser did not grant that it stays awake.');
  if (battery !== null && !battery.charging)
    found.push(
      `On battery, ${formatPercent(battery.level)} left${battery.level < LOW_BATTERY ? ': it will not last the night' : ''}. Plug the device in.`,
    );
  return found;
}
