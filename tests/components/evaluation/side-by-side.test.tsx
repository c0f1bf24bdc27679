import { fireEvent, render, screen, within } from '@testing-library/react';
import { beyondAxes, sharedAxes } from '@/components/charts';
import { SideBySidePanel } from '@/components/evaluation/side-by-side-panel';
import { residualRms } from '@/shared/evaluation/residual-rms';
import type { FitCurve } from '@/shared/evaluation/result';
import { normalDeviates } from '../../support/lcg';

const dwell = (seq: number, station: string, restUrad: number[]): FitCurve => ({
  ...{
    seq,
    station,
    startUtcMs: Date.UTC(2031, 1, 14) + seq * 900_000,
    tS: restUrad.map((_, at) => 60 * at),
    modelRad: restUrad.map(() => 1e-3),
  },
  dataRad: restUrad.map((rest) => 1e-3 + rest * 1e-6),
});
const curves = [
  dwell(4, 'far', [3, -3, 3, -3]),
  dwell(6, 'near', [1, -1]),
  dwell(8, 'far', [0, -12, 0, 0, 0]),
  dwell(9, 'parked', [0.5, 0.5]),
];
const plain = (text: string | null) => (text ?? '').replaceAll(/[\u202f\u00a0]/g, ' ');

test('every dwell stands on the axes of the longest and of the greatest residual, where nothing stands out', () => {
  const axes = sharedAxes(curves);
  expect(axes.timeS).toEqual([0, 240]);
  expect(sharedAxes(curves.slice(0, 2)).reachRad).toBeCloseTo(2e-6, 12);
  expect(sharedAxes([curves[0] as FitCurve, dwell(5, 'near', [4, -5, 2])]).reachRad).toBeCloseTo(5e-6, 12);
  // 3, −3, 3, −3 about zero: 3 by definition; one of −12 among five: 12/√5.
  expect(residualRms(curves[0] as FitCurve)).toEqual({ value: expect.closeTo(3e-6, 12) as number, u: null });
  expect(residualRms(curves[2] as FitCurve).value).toBeCloseTo(12e-6 / Math.sqrt(5), 12);
});

test.each([
  ['one bin', [3, -3, -210, 3, -3, 3]],
  ['a whole dwell', [-190, 180, -210, 150, 200, -160]],
])('%s that stands out flattens no other dwell: it is marked, its number in words', (_what, restUrad) => {
  const usual = Array.from({ length: 11 }, (_, k) => dwell(2 * k + 10, k % 2 === 0 ? 'near' : 'far', [3, -3, 3, -3, 3, -3]));
  const all = [...usual, dwell(40, 'far', restUrad)];
  const axes = sharedAxes(all);
  expect(axes.reachRad).toBeCloseTo(6e-6, 12);
  expect(usual.map((curve) => beyondAxes(curve, axes))).toEqual(usual.map(() => null));
  const bins = restUrad.filter((rest) => Math.abs(rest) > 6).length;
  expect(beyondAxes(all.at(-1) as FitCurve, axes)).toEqual({ bins, farthestRad: expect.closeTo(-210e-6, 9) as number });
  render(<SideBySidePanel curves={all} selected={null} onSelect={jest.fn()} />);
  expect(plain(screen.getByText(`${bins} beyond, to −210 µrad`).textContent)).toBeTruthy();
  expect(plain(screen.getByRole('button', { name: /^Dwell 40 / }).getAttribute('aria-label'))).toContain(
    `${bins} beyond, to −210 µrad: show its fit`,
  );
});

test('a side that is noisier than the other stays in sight as a whole', () => {
  const night = Array.from({ length: 12 }, (_, k) =>
    dwell(
      k,
      k % 2 === 0 ? 'near' : 'far',
      [1, -1, 1, -1].map((sign) => sign * (k % 2 === 0 ? 2 : 9)),
    ),
  );
  expect(sharedAxes(night).reachRad).toBeCloseTo(9e-6, 12);
});

test('near stands beside far, each dwell says its residual with its unit, and a tap chooses it', () => {
  const onSelect = jest.fn();
  render(<SideBySidePanel curves={curves} selected={6} onSelect={onSelect} />);
  const seqs = (name: string) =>
    within(screen.getByRole('list', { name }))
      .getAllByRole('button')
      .map((button) => plain(button.getAttribute('aria-label')));
  expect(seqs('Dwells: near')).toEqual(['Dwell 6 at near, residual rms 1.000 µrad, u not known: show its fit']);
  expect(seqs('Dwells: far')).toEqual([
    'Dwell 4 at far, residual rms 3.000 µrad, u not known: show its fit',
    'Dwell 8 at far, residual rms 5.4(3.8) µrad, 1 beyond, to −12 µrad: show its fit',
  ]);
  expect(seqs('Dwells: elsewhere')).toHaveLength(1);
  expect(screen.getByRole('button', { pressed: true }).getAttribute('aria-label')).toContain('Dwell 6');
  fireEvent.click(screen.getByRole('button', { name: /^Dwell 8/ }));
  expect(onSelect).toHaveBeenCalledWith(8);
});

test('the u of a residual rms is what the scatter of many such dwells shows', () => {
  const normal = normalDeviates(23);
  // A straight line and two amplitudes are as good as taken off where the noise has none: 4 of 60 in the sum of squares.
  const found = Array.from({ length: 2000 }, () => residualRms(dwell(1, 'near', Array.from({ length: 56 }, normal))).value);
  const mean = found.reduce((sum, value) => sum + value, 0) / 2000;
  const scatter = Math.sqrt(found.reduce((sum, value) => sum + (value - mean) ** 2, 0) / 1999);
  const { value, u } = residualRms(
    dwell(
      1,
      'near',
      Array.from({ length: 60 }, (_, k) => (k % 2 === 0 ? 1 : -1)),
    ),
  );
  expect((u as number) / value / (scatter / mean)).toBeGreaterThan(0.93);
  expect((u as number) / value / (scatter / mean)).toBeLessThan(1.07);
});

test('one dwell has nothing to stand beside', () => {
  render(<SideBySidePanel curves={curves.slice(0, 1)} selected={4} onSelect={jest.fn()} />);
  expect(screen.queryByTestId('side-by-side')).toBeNull();
});
