import { formatFixed, formatSignificant, NARROW_SPACE, withUnit } from './format-number';
import { formatUncertain, type UncertainOptions } from './format-uncertain';

/** A turntable angle: `20.18°`, `−175.00°`. */
export function formatDegrees(deg: number | null, decimals = 2): string {
  return deg === null ? '–' : `${formatFixed(deg, { decimals })}°`;
}

/** From one milliradian up in mrad, below in µrad: readings of a torsion balance span both. */
function deflectionScale(rad: number): { factor: number; unit: 'mrad' | 'µrad' } {
  return Math.abs(rad) >= 0.999_95e-3 ? { factor: 1e3, unit: 'mrad' } : { factor: 1e6, unit: 'µrad' };
}

/** A pendulum angle with its sign: number `+1.187` and unit `mrad`, apart so that a screen can set the unit dimmer. */
export function deflectionParts(rad: number | null): { number: string; unit: string } {
  if (rad === null || !Number.isFinite(rad)) return { number: '–', unit: 'mrad' };
  const { factor, unit } = deflectionScale(rad);
  return { number: formatFixed(rad * factor, { decimals: unit === 'mrad' ? 3 : 1, signed: true }), unit };
}

/** A pendulum angle with its sign: `+1.187 mrad`, `−12.4 µrad`. */
export function formatDeflection(rad: number | null): string {
  const { number, unit } = deflectionParts(rad);
  return number + NARROW_SPACE + unit;
}

const scaledUncertain = (angle: { value: number; u: number | null }) => {
  const { factor, unit } = deflectionScale(angle.value);
  return { value: angle.value * factor, u: angle.u === null ? null : angle.u * factor, unit };
};

/** A measured pendulum angle: `2.374(41) mrad`. */
export function formatDeflectionUncertain(angle: { value: number; u: number | null }, options: UncertainOptions = {}): string {
  return formatUncertain(scaledUncertain(angle), options);
}

const ofPlace = new Set(['rad', 'mrad', 'urad', 'm', 'mm']);

/** A reading of a channel in the channel's own unit, with digits to suit its size; a deflection with its sign, either way of it. */
export function formatReading(value: number, unit: string): string {
  if (unit === 'rad') return formatDeflection(value);
  return withUnit(formatSignificant(value, 4, { signed: ofPlace.has(unit) }), unit);
}

/** A reading whose standard uncertainty is known; without one as `formatReading`. */
export function formatKnownReading({ value, u }: { value: number; u: number | null }, unit: string): string {
  if (u === null) return formatReading(value, unit);
  return unit === 'rad' ? formatDeflectionUncertain({ value, u }, { signed: true }) : formatUncertain({ value, u, unit });
}
