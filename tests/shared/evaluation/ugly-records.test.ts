import { fitRingDown } from '@/shared/evaluation/ring-down-fit';
import { boxAverage } from '@/shared/statistics/box-average';
import type { RingDownData } from '@/shared/statistics/ring-down';
import { ringDownStart } from '@/shared/statistics/ring-down-start';
import { normalDeviates } from '../../support/lcg';

/** Records as laboratories bring them. Nothing is told of the period, and the start must never lead into a false valley. */

interface Record {
  periodS: number;
  decayS: number;
  spanS: number;
  stepS: number;
  amplitude: number;
}

function record({ periodS, decayS, spanS, stepS, amplitude }: Record, added: (tS: number) => number): { t: Float64Array; y: Float64Array } {
  const t = Float64Array.from({ length: Math.floor(spanS / stepS) }, (_, k) => (k + 0.5) * stepS);
  return { t, y: t.map((tS) => 0.2 + amplitude * Math.exp(-tS / decayS) * Math.cos((2 * Math.PI * tS) / periodS + 0.7) + added(tS)) };
}

function periodOf(data: readonly RingDownData[]): number {
  const start = ringDownStart(data, null);
  const found = fitRingDown(data, start, null);
  return (2 * Math.PI) / (found?.ringDown?.omega ?? NaN);
}

const boxed = ({ t, y }: { t: Float64Array; y: Float64Array }, width: number): RingDownData => {
  const { t: tS, y: mean, weight } = boxAverage(t, y, width);
  return { tS, y: mean, weight };
};

test.each([95, 240, 421.7, 610])('a free decay of 54 minutes at 10 Hz, period %d s', (periodS) => {
  const normal = normalDeviates(71);
  const one = record({ periodS, decayS: 2.4 * periodS, spanS: 3240, stepS: 0.1, amplitude: 2e-3 }, () => 1e-5 * normal());
  expect(Math.abs(periodOf([boxed(one, 5)]) / periodS - 1)).toBeLessThan(1e-3);
});

test.each([240, 421.7])('a record that begins in a disturbance five times the signal, period %d s', (periodS) => {
  const normal = normalDeviates(73);
  const people = (tS: number) => (tS < 90 ? 1e-2 * Math.sin(9.04 * tS + Math.sin(tS)) * Math.exp(-tS / 30) : 0);
  const one = record({ periodS, decayS: 1100, spanS: 2400, stepS: 0.1, amplitude: 2e-3 }, (tS) => people(tS) + 1e-5 * normal());
  expect(Math.abs(periodOf([boxed(one, 5)]) / periodS - 1)).toBeLessThan(5e-3);
});

test.each([180, 421.7, 600])('two series by hand, every 10 s to a millimetre, ten minutes apart, period %d s', (periodS) => {
  // 5 m away a millimetre is 0.1 mrad; the spot swings by 20 mm.
  const whole = record({ periodS, decayS: 1500, spanS: 3000, stepS: 10, amplitude: 0.02 }, () => 0);
  const read = whole.y.map((metres) => Math.round(metres * 1000) / 1000);
  const part = (from: number, to: number): RingDownData => {
    const keep = [...whole.t.keys()].filter((k) => (whole.t[k] as number) >= from && (whole.t[k] as number) < to);
    return { tS: Float64Array.from(keep, (k) => (whole.t[k] as number) - from), y: Float64Array.from(keep, (k) => read[k] as number) };
  };
  expect(Math.abs(periodOf([part(0, 1200), part(1800, 3000)]) / periodS - 1)).toBeLessThan(5e-3);
});
