import type { StepRow } from '@/shared/archive/run-records';
import { momentsIn } from '@/shared/camera/moments';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { smallArchiveInput } from '@/tests/support/small-archive';

const [row] = smallArchiveInput().steps as [StepRow];
const steps: ProtocolDocument['steps'] = [
  { kind: 'home' },
  {
    kind: 'repeat',
    times: 2,
    steps: [
      { kind: 'swing', to: 'near' },
      { kind: 'mark', label: 'look', frame: true },
    ],
  },
  { kind: 'mark', label: 'only words' },
] as ProtocolDocument['steps'];
const protocol = { steps };
const rowOf = (seq: number, changes: Partial<StepRow>): StepRow => ({ ...row, seq, startUtcMs: 1000 * seq, endUtcMs: null, ...changes });
const swing = (seq: number, endUtcMs: number | null = null) => rowOf(seq, { kind: 'swing', path: '2.repeat[1].1.swing', endUtcMs });

test('both ends of a swing are asked for once each, though its row is saved again and again', () => {
  const seen = new Set<string>();
  expect(momentsIn([swing(2)], protocol, seen)).toEqual([{ seq: 2, moment: 'swing-began', utcMs: 2000 }]);
  expect(momentsIn([swing(2)], protocol, seen)).toEqual([]);
  expect(momentsIn([swing(2, 9000)], protocol, seen)).toEqual([{ seq: 2, moment: 'swing-ended', utcMs: 9000 }]);
  expect(momentsIn([swing(2, 9000), swing(4, 12_000)], protocol, seen).map(({ seq, moment }) => [seq, moment])).toEqual([
    [4, 'swing-began'],
    [4, 'swing-ended'],
  ]);
});

test('a mark asks only where its step says so, a dwell never', () => {
  const rows = [
    rowOf(3, { kind: 'mark', path: '2.repeat[1].2.mark' }),
    rowOf(6, { kind: 'mark', path: '3.mark' }),
    rowOf(7, { kind: 'dwell' }),
  ];
  expect(momentsIn(rows, protocol, new Set())).toEqual([{ seq: 3, moment: 'mark', utcMs: 3000 }]);
});
