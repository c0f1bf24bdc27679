import { render, screen } from '@testing-library/react';
import { NearFar } from '@/components/morning/nights';
import type { MorningNight, MorningSheet } from '@/shared/contracts/morning';

const night = (runId: string, value: number, u: number | null): MorningNight => ({
  ...{ runId, startedAt: '2031-03-14T22:00:00Z', control: false, period_s: null, decayTime_s: null, kappa_N_m: null },
  reversal_rad: { value, u },
});

const shown = (values: readonly [number, number | null][]) => {
  const [tonight, ...earlier] = values.map(([value, u], k) => night(`run-${k}`, value, u)) as [MorningNight, ...MorningNight[]];
  render(<NearFar sheet={{ tonight, earlier } as unknown as MorningSheet} rehearsal={false} timeZone="Europe/Oslo" />);
  return screen.queryByTestId('nights-together')?.textContent?.replace(/\s/gu, ' ') ?? null;
};

test('three nights that scatter four times as much as they say come with both ways to take that', () => {
  const text = shown([
    [1.004e-3, 1e-6],
    [1e-3, 1e-6],
    [0.996e-3, 1e-6],
  ]);
  // Means of equal u: 1/√3 µrad four times as great; a scatter of √15 µrad beside 1 µrad gives the same, and three nights tell it poorly.
  expect(text).toContain('1.0000(23) mrad');
  expect(text).toContain('3 nights together, which scatter 4.0 times as much as their u say');
  expect(text).toContain('if each night has 3.9(1.7) µrad of its own');
});

test('nights that agree are said to, and two nights are not combined', () => {
  expect(
    shown([
      [1.0001e-3, 1e-6],
      [1e-3, 1e-6],
      [0.9999e-3, 1e-6],
    ]),
  ).toContain('3 nights together, which scatter no more than their u say');
});

test('two nights, or nights without u, are not combined', () => {
  expect(
    shown([
      [1e-3, 1e-6],
      [1.1e-3, 1e-6],
      [1.2e-3, null],
    ]),
  ).toBeNull();
});
