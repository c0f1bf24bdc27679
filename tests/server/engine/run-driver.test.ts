import { verifyChain } from '@/shared/archive/chain';
import { makeBench, runStart, sha256, shortProtocol, startUtcMs, underWay } from './rig-bench';

const brief = (bench: { store: { log(): { kind: string; outcome: string | null }[] } }) => bench.store.log().map(({ kind, outcome }) => `${kind} ${outcome}`);

test('a run goes through its protocol and leaves a whole log and a valid chain', async () => {
  const bench = await underWay(300);
  expect(bench.driver.facts()).toMatchObject({ state: 'finished', reason: '', dwellsDone: 2, dwellsPlanned: 2, mayResume: { ok: false } });
  expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
  expect(bench.store.log().map(({ station }) => station)).toEqual(['inline', 'near', 'near', 'near', 'far', 'far']);
  expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true, events: bench.store.events.length });
  expect(bench.store.kinds().slice(0, 3)).toEqual(['run-started', 'step-began', 'step-ended']);
  expect(bench.store.kinds().at(-1)).toBe('finished');
});
