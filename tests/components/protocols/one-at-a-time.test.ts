import { oneAtATime } from '@/components/protocols/one-at-a-time';

/** Drafts are saved in this way: each save is over the version that the one before it was given. */

/** A server that takes a document only over its newest version, and answers when told. */
function slowServer() {
  let version = 1;
  const answers: (() => void)[] = [];
  const save = (over: number) =>
    new Promise<number>((resolve, reject) => {
      answers.push(() => (over === version ? resolve((version += 1)) : reject(new Error(`edited meanwhile: ${version}`))));
    });
  const answer = async () => {
    answers.shift()?.();
    for (let turn = 0; turn < 10; turn += 1) await null;
  };
  return { save, answer, asked: () => answers.length };
}

test('two saves at once: the second waits, and is over what the first stored', async () => {
  const { save, answer, asked } = slowServer();
  const inTurn = oneAtATime();
  let known = 1;
  const flush = () => inTurn(async () => (known = await save(known)));
  const both = Promise.all([flush(), flush()]);
  await null;
  expect(asked()).toBe(1);
  await answer();
  expect(asked()).toBe(1);
  await answer();
  expect(await both).toEqual([2, 3]);
});

test('a save that fails keeps none of the others waiting', async () => {
  const inTurn = oneAtATime();
  const failed = inTurn(() => Promise.reject(new Error('no answer')));
  const next = inTurn(() => Promise.resolve('stored'));
  await expect(failed).rejects.toThrow('no answer');
  expect(await next).toBe('stored');
});
