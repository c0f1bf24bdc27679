import { stagesOf } from '@/components/runs/intervention';

const at = (second: number) => new Date(Date.UTC(2031, 0, 14, 22, 0, second)).toISOString();
const accepted = { kind: 'accepted', act: 'hold', serverAtMs: Date.parse(at(10)) } as const;

test('a hold that was resumed is no longer waited for', () => {
  const resumed = { kind: 'resume', by: 'Ilse Marrowby', serverAt: at(30), confirmedAt: null } as const;
  expect(stagesOf(accepted, resumed, 'running')).toBeNull();
});

test('a stop by somebody else takes the place of an own hold', () => {
  const stopped = { kind: 'stop', by: 'Pim Oldershaw', serverAt: at(30), confirmedAt: null } as const;
  expect(stagesOf(accepted, stopped, 'stopping')).toMatchObject({ act: 'stop', by: 'Pim Oldershaw', controller: { state: 'now' } });
});

test('until the server tells of it, an accepted hold waits for the controller', () => {
  const before = { kind: 'resume', by: 'Ilse Marrowby', serverAt: at(5), confirmedAt: at(6) } as const;
  expect(stagesOf(accepted, before, 'running')).toMatchObject({ act: 'hold', server: { state: 'done' }, controller: { state: 'now' } });
});

test('a hold without an answer in 30 s is known all the same once the server tells of it', () => {
  const unanswered = { kind: 'unanswered', act: 'hold', tappedAtMs: Date.parse(at(10)), attempts: 8 } as const;
  const held = { kind: 'hold', by: 'Ilse Marrowby', serverAt: at(11), confirmedAt: at(12) } as const;
  expect(stagesOf(unanswered, held, 'held')).toMatchObject({ by: null, sentence: '', controller: { state: 'done' } });
  expect(stagesOf(unanswered, { ...held, serverAt: at(2) }, 'held')).toMatchObject({ server: { state: 'failed' } });
});
