import { ApiProblem, ApiUnreachable } from '@/components/api/problem';
import { firstPartBytes, nextPartBytes, upload, waitMs, type UploadProgress } from '@/components/data/upload';
import type { ProblemCode } from '@/shared/contracts/problem';
import type { ImportView } from '@/shared/contracts/import-files';

const problem = (code: ProblemCode, path?: string) =>
  new ApiProblem({
    type: '',
    title: '',
    status: 409,
    code,
    detail: `refused: ${code}`,
    errors: path === undefined ? [] : [{ path, message: '' }],
  });

/** A server that has some bytes of a file of 3.5 MiB, a network that fails as told, and a clock. */
function setting(failures: (Error | 'answer-lost' | null)[] = []) {
  const file = new Blob([new Uint8Array(3.5 * 1_048_576)]);
  let bytes = 0;
  let nowMs = 0;
  const viewOf = (): ImportView => ({
    ...{ id: 'i', runId: 'r', fileName: 'night.csv', state: bytes === file.size ? 'received' : 'waiting', bytes, wantedBytes: file.size },
    ...{ changedAt: null, sha256: null, preview: null, createdAt: '', createdBy: '', storedAt: null, channelId: null },
  });
  const sent: [from: number, length: number][] = [];
  const told: UploadProgress[] = [];
  const waited: number[] = [];
  const abort = new AbortController();
  return {
    ...{ sent, told, waited, abort, file },
    have: (already: number) => (bytes = already),
    run: () =>
      upload({
        ...{ file, view: viewOf(), signal: abort.signal, tell: (progress) => told.push(progress), nowMs: () => nowMs },
        look: async () => viewOf(),
        wait: async (ms) => void waited.push(ms),
        send: async (offset, part) => {
          sent.push([offset, part.size]);
          nowMs += 2000;
          const failure = failures.shift() ?? null;
          if (failure instanceof Error) throw failure;
          if (offset !== bytes) throw problem('not-possible-now', 'offset');
          bytes += part.size;
          if (failure === 'answer-lost') throw new ApiUnreachable();
          return viewOf();
        },
      }),
  };
}

test('a file goes in parts, one behind the other, and how much has come is told', async () => {
  const { run, sent, told, file } = setting();
  expect(await run()).toMatchObject({ state: 'received', bytes: file.size });
  expect(sent.map(([from]) => from)).toEqual([0, 1, 2, 3].map((part) => part * firstPartBytes));
  expect(told.map(({ sent: so }) => so / firstPartBytes)).toEqual([0, 1, 2, 3, 3.5]);
  expect(told.every(({ waiting }) => waiting === null)).toBe(true);
});

test('one that came in part goes on where it stopped', async () => {
  const { run, sent, have } = setting();
  have(3 * 1_048_576);
  await run();
  expect(sent).toEqual([[3 * 1_048_576, 0.5 * 1_048_576]]);
});

test('a network that is away is waited for, ever longer, and nothing is sent twice that has come', async () => {
  const { run, sent, told, waited } = setting([null, new ApiUnreachable(), new ApiUnreachable(), 'answer-lost']);
  expect(await run()).toMatchObject({ state: 'received' });
  expect(told.filter(({ waiting }) => waiting === 'The network is away.')).toHaveLength(3);
  const offsets = sent.map(([from]) => from);
  expect(offsets.slice(0, 4)).toEqual([0, firstPartBytes, firstPartBytes, firstPartBytes]);
  // The part whose answer was lost had come.
  expect(offsets[4]).toBeGreaterThan(firstPartBytes);
  expect(waited.length).toBe(3);
  expect([1, 2, 3, 20].map(waitMs)).toEqual([1000, 2000, 4000, 15_000]);
});

test('a server that is busy or without its store is tried again, its words shown', async () => {
  const { run, told } = setting([problem('files-away'), problem('too-many-requests'), problem('not-possible-now', 'offset')]);
  expect(await run()).toMatchObject({ state: 'received' });
  expect(told.map(({ waiting }) => waiting).filter((words) => words !== null)).toEqual([
    'refused: files-away',
    'refused: too-many-requests',
    'Looking how much has come.',
  ]);
});

test('what no other try would change ends it, and so does whoever cancels', async () => {
  for (const code of ['too-large', 'not-allowed', 'no-room', 'unreadable-data', 'not-possible-now'] as const)
    await expect(setting([problem(code)]).run()).rejects.toThrow(`refused: ${code}`);
  const cancelled = setting([new ApiUnreachable()]);
  const running = cancelled.run();
  cancelled.abort.abort(new Error('cancelled'));
  await expect(running).rejects.toThrow('cancelled');
  expect(cancelled.sent).toHaveLength(1);
});

test('parts grow on a quick network and shrink on a slow one, within bounds', () => {
  expect(nextPartBytes(1_048_576, 200)).toBe(2_097_152);
  expect(nextPartBytes(1_048_576, 2000)).toBe(1_048_576);
  expect(nextPartBytes(1_048_576, 9000)).toBe(524_288);
  expect(nextPartBytes(8 * 1_048_576, 1)).toBe(8 * 1_048_576);
  expect(nextPartBytes(262_144, 60_000)).toBe(262_144);
});
