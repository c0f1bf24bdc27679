import type { ProtocolDocument } from '@/shared/protocol/document';
import { makeBench, runStart } from '@/tests/server/engine/rig-bench';

/** A stop sent three times, at any instant of a run, with the database there, gone or slow: it goes out at once, the run ends once, and nothing moves after it. */

const STOPS = 40;
const protocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'Stops',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 20 },
    { kind: 'swing', to: 'far' },
    { kind: 'dwell', for_s: 20 },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 20 },
  ],
};
const databases = ['there', 'away', 'answers lost'] as const;

test(`${STOPS} stops, each sent three times, with and without a database`, async () => {
  for (let number = 0; number < STOPS; number += 1) {
    const bench = makeBench(runStart(protocol));
    const database = databases[number % databases.length] ?? 'there';
    bench.driver.start();
    // The golden ratio spreads the instants evenly over the run, whatever their number.
    await bench.pass(1 + ((number * 0.618) % 1) * 70);
    const answers = { there: 'none', away: 'away', 'answers lost': 'answer-lost' } as const;
    bench.store.fault = () => answers[database];
    const before = bench.link.commands.length;
    const atMs = bench.clock.utcMs();
    const given = [bench.driver.stop('Ben'), bench.driver.stop('Ben'), bench.driver.stop('Ben')];
    const story = `stop ${number}, database ${database}`;
    expect([story, given.map(({ ok }) => ok)]).toEqual([story, [true, true, true]]);
    // On the wire before the clock goes on.
    const stops = () => bench.link.commands.slice(before).filter(({ kind }) => kind === 'stop');
    expect([story, stops().length > 0, bench.clock.utcMs() - atMs]).toEqual([story, true, 0]);
    await bench.pass(30);
    bench.store.fault = () => 'none';
    await bench.pass(60);
    expect([story, bench.driver.facts().state]).toEqual([story, 'stopped']);
    const after = bench.link.commands.slice(before).filter(({ kind }) => kind === 'move' || kind === 'home');
    expect([story, after]).toEqual([story, []]);
    expect([story, bench.store.kinds().filter((kind) => kind === 'stopped').length]).toEqual([story, 1]);
  }
}, 60_000);
