import { stepTitle } from '@/components/runs/run-words';
import type { ProtocolDocument } from '@/shared/protocol/document';

const row = { kind: 'swing', station: '', label: '', path: '2.swing', outcome: 'cut short' } as const;
const withSwings = {
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'repeat', times: 2, steps: [{ kind: 'swing', to: { angle_deg: 12.5 } }] },
  ] as ProtocolDocument['steps'],
  atEnd: { station: 'clear' },
};

describe('a swing', () => {
  test.each([
    ['cut short names where it was to go', row, 'Swing to near, cut short'],
    [
      'in a repeat is found by its place, and an angle is named as an angle',
      { ...row, path: '3.repeat[2].1.swing' },
      'Swing to 12.50°, cut short',
    ],
    ['after the last step goes where the protocol ends', { ...row, path: 'atEnd.swing' }, 'Swing to clear, cut short'],
    ['that arrived names its station once', { ...row, station: 'near', outcome: 'done' as const }, 'Swing to near'],
    ['of which nothing is known says no more than it knows', { ...row, path: '9.swing' }, 'Swing, cut short'],
  ])('%s', (_, cut, title) => {
    expect(stepTitle(cut, withSwings).replaceAll('\u202f', ' ')).toBe(title);
  });
});
