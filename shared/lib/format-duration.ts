import { formatFixed, NARROW_SPACE } from './format-number';

/** A running countdown: `6:12`, `1:02:09`. Rounded up, so that 0:00 means that nothing is left. Negative counts as 0. */
export function formatCountdown(seconds: number): string {
  if (!Number.isFinite(seconds)) return '–';
  const total = Math.max(0, Math.ceil(seconds - 1e-6));
  const h = Math.floor(total / 3600);
  const min = Math.floor((total % 3600) / 60);
  const s = String(total % 60).padStart(2, '0');
  return h > 0 ? `${h}:${String(min).padStart(2, '0')}:${s}` : `${min}:${s}`;
}

/** {@link formatCountdown} with the minutes always in two digits, for a display that must not change its width: `06:12`. */
export function formatCountdownWide(seconds: number): string {
  const text = formatCountdown(seconds);
  return /^\d:\d\d$/.test(text) ? `0${text}` : text;
}

const part = (amount: number | string, unit: string) => `${amount}${NARROW_SPACE}${unit}`;

/**
 * A length of time in its two leading units: `9 h 11 min`, `13 min 50 s`, `12.5 s`, `2 d 8 h`. Under a minute with at
 * most one decimal. Negative durations carry a minus sign.
 */
export function formatDuration(seconds: number): string {
  if (!Number.isFinite(seconds)) return '–';
  if (seconds < 0) return `\u2212${formatDuration(-seconds)}`;
  if (seconds < 59.95) return part(formatFixed(seconds, { decimals: Math.abs(seconds - Math.round(seconds)) < 0.05 ? 0 : 1 }), 's');
  const whole = Math.round(seconds);
  if (whole < 3600) return two([Math.floor(whole / 60), 'min'], [whole % 60, 's']);
  const minutes = Math.round(seconds / 60);
  if (minutes < 48 * 60) return two([Math.floor(minutes / 60), 'h'], [minutes % 60, 'min']);
  const hours = Math.round(seconds / 3600);
  return two([Math.floor(hours / 24), 'd'], [hours % 24, 'h']);
}

function two(major: [number, string], minor: [number, string]): string {
  return minor[0] === 0 ? part(...major) : `${part(...major)} ${part(...minor)}`;
}

/** How long ago something was, for a stale reading: `just now`, `12 s ago`, `4 min ago`. */
export function formatAgo(seconds: number): string {
  if (seconds < 1) return 'just now';
  if (seconds < 60) return `${part(Math.floor(seconds), 's')} ago`;
  if (seconds < 3600) return `${part(Math.floor(seconds / 60), 'min')} ago`;
  return `${formatDuration(Math.floor(seconds / 60) * 60)} ago`;
}

/** A difference between actual and planned: `+0.42 s`, `−3 ms`, `+4 min 2 s`; below a millisecond `on time`. */
export function formatDelay(seconds: number): string {
  const size = Math.abs(seconds);
  if (size < 0.0005) return 'on time';
  const sign = seconds < 0 ? '\u2212' : '+';
  if (size < 0.9995) return sign + part(Math.round(size * 1000), 'ms');
  if (size < 59.95) return sign + part(size.toFixed(size < 10 ? 2 : 1), 's');
  return sign + formatDuration(size);
}

/** The standard uncertainty of an instant: `± 0.2 ms`, `± 15 µs`, `± 1.2 s`; two digits below 9.5, as u itself is known no better. */
export function formatTimeUncertainty(uS: number): string {
  if (!Number.isFinite(uS)) return '±\u202f?';
  const [scale, unit] = uS < 0.000_099_5 ? [1e6, 'µs'] : uS < 0.9995 ? [1e3, 'ms'] : [1, 's'];
  const scaled = uS * scale;
  const text = scaled === 0 ? '0' : scaled < 9.95 ? String(Number(scaled.toPrecision(2))) : String(Math.round(scaled));
  return `±${NARROW_SPACE}${part(text, unit)}`;
}
