import { appendEvent, emptyChain, verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { sha256Hex } from '@/server/evaluation/sha256';
import { growth, report } from './report';

/** Verifies chains of 10⁴, 10⁵ and 10⁶ events; the peer is the bare hashing of the same texts. */

function chainOf(size: number): ChainedEvent[] {
  const events: ChainedEvent[] = [];
  let head = emptyChain;
  for (let index = 0; index < size; index += 1) {
    const at = new Date(946_684_800_000 + index * 1000).toISOString();
    const event = appendEvent(
      head,
      { at, kind: 'step-ended', data: { seq: index, path: `4.repeat[${index}].1.swing`, angleDeg: 20.18, outcome: 'done' } },
      sha256Hex,
    );
    events.push(event);
    head = event;
  }
  return events;
}

const seconds = (work: () => void) => {
  const start = performance.now();
  work();
  return (performance.now() - start) / 1000;
};

verifyChain(chainOf(10_000), sha256Hex);
const points = [10_000, 100_000, 1_000_000].map((size) => {
  const events = chainOf(size);
  const cost = seconds(() => {
    if (!verifyChain(events, sha256Hex).valid) throw new Error('the chain of the benchmark is not valid');
  });
  const texts = events.map((event) => JSON.stringify(event));
  const peer = seconds(() => texts.forEach(sha256Hex));
  report({ name: `chain ${size}`, value: cost, unit: 's', goal: (10 * size) / 1_000_000, want: 'at most', peer });
  return { size, cost };
});
report({ name: 'chain growth', value: growth(points), unit: 'exponent', goal: 1.1, want: 'at most', peer: null });
