import { drawnMark, markedSpan, nothingMarked, withEnd } from '@/components/charts/marking';
import { showing } from '@/components/charts/time-plot-types';

const whole = { from: 1000, to: 9000 };

test('two ends make a stretch, whichever comes first', () => {
  const one = withEnd(nothingMarked, 5000);
  expect(markedSpan(one, whole)).toBeNull();
  expect(drawnMark(one, whole)).toEqual({ from: 5000, to: 5000 });
  const both = withEnd(one, 3000);
  expect(markedSpan(both, whole)).toEqual({ from: 3000, to: 5000 });
  expect(drawnMark(both, whole)).toEqual({ from: 3000, to: 5000 });
});

test('a third end begins anew, so that a slip of the thumb costs nothing', () => {
  const third = withEnd(withEnd(withEnd(nothingMarked, 5000), 3000), 7000);
  expect(markedSpan(third, whole)).toBeNull();
  expect(third).toEqual({ one: 7000, other: null });
});

test('a stroke that leaves the plot ends where the data end, and one without length is none', () => {
  expect(markedSpan({ one: 200, other: 4000 }, whole)).toEqual({ from: 1000, to: 4000 });
  expect(markedSpan({ one: 4000, other: 1e9 }, whole)).toEqual({ from: 4000, to: 9000 });
  expect(markedSpan({ one: 4000, other: 4000 }, whole)).toBeNull();
  expect(markedSpan({ one: 100, other: 900 }, whole)).toBeNull();
  expect(drawnMark(nothingMarked, whole)).toBeNull();
});

test('the plot follows a cursor that leaves it just as far as it must', () => {
  const span = { from: 3000, to: 5000 };
  expect(showing(span, whole, 4000)).toEqual(span);
  expect(showing(span, whole, 5200)).toEqual({ from: 3200, to: 5200 });
  expect(showing(span, whole, 2500)).toEqual({ from: 2500, to: 4500 });
});
