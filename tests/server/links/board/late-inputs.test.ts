import type { OkBody, Order } from '@/firmware-protocol/codec';
import { BoardBench } from '@/scripts/soak/board/board-bench';

/**
 * Working a motion out takes the board milliseconds. A contact that opens meanwhile is known to an interrupt before the program looks again:
 * no step may follow it (SPEC 8.5, 11.1, 11.2), whatever the microsecond.
 */

const bench = new BoardBench();
bench.home();
const homed = bench.keep();

const CYCLES_PER_MS = 16_000;
/** From the last byte of the order on; the first step of a move comes after about 1.9 ms, that of a nudge at rest alike. */
const MOMENTS_MS = Array.from({ length: 34 }, (_, index) => index * 0.08);
const orders: Record<string, (tag: string) => Order> = {
  move: (tag) => ({ word: 'move', tag, position: 4000, speed: 8_000_000, acceleration: 20_000_000, beginUs: null }),
  nudge: (tag) => ({ word: 'nudge', tag, steps: 300 }),
  home: (tag) => ({ word: 'home', tag }),
};

describe.each(['supply', 'interlock'] as const)('the %s is lost while the board works out', (input) => {
  test.each(Object.keys(orders))('a %s: no step follows, and it is no fault', (word) => {
    let before = 0;
    for (const ms of MOMENTS_MS) {
      homed();
      bench.pass(2_500);
      bench.ask({ word: 'renew' });
      bench.edges.length = bench.events.length = 0;
      const { board } = bench.session;
      const tag = bench.nextTag();
      const opens = Math.round(board.send(bench.text((orders[word] as (tag: string) => Order)(tag))) + ms * CYCLES_PER_MS);
      board.runTo(opens);
      const steps = () => bench.edges.filter(({ pin, level }) => pin === 'step' && level).length;
      const stepsBefore = steps();
      before += stepsBefore;
      board.setInput(input, false);
      board.runTo(opens + 300 * CYCLES_PER_MS);
      expect({ ms, after: steps() - stepsBefore }).toEqual({ ms, after: 0 });
      bench.pass(0);
      const ended = bench.events.find(({ what }) => what.word === 'ended' && what.tag === tag);
      if (ended !== undefined) expect(ended.what).toMatchObject({ cause: input });
      expect((bench.ask({ word: 'status' }).body as OkBody).state).toBe('rest');
      board.setInput(input, true);
      bench.pass(100);
    }
    // The latest of these moments lie behind the first step.
    if (word === 'move') expect(before).toBeGreaterThan(0);
  });
});
