import { GuidedMoves } from '@/server/engine/guided-moves';
import { GuidedRefused, type GuidedRig } from '@/server/engine/guided-orders';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController } from '@/server/links/simulated-controller';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';
import { settle, startUtcMs } from './rig-bench';

/** A guided first move on the simulated controller, behind the same bytes as a real one. */

export const anna = { id: 'u-anna', name: 'Anna Fellstone' };

export async function makeBench(motion: RigMotion = demoRigWide.motion as RigMotion, start: { startDeg?: number; homed?: boolean } = {}) {
  const clock = new VirtualClock(startUtcMs, settle);
  const turntable = createSimulatedController({ clock, rig: motion, ...start });
  const link = createLink({ factory: turntable.factory, clock, rig: motion, epoch: 3 });
  const world = { armed: true, run: null as string | null, lock: null as string | null, ended: [] as string[] };
  const moves = new GuidedMoves({
    clock,
    linkOf: () => link,
    armOf: () => (world.armed ? { name: 'Anna Fellstone', untilUtcMs: startUtcMs + 3_600_000 } : null),
    takenBy: () => world.run,
    lockedBy: () => world.lock,
    endArm: (_rig, why) => {
      world.armed = false;
      world.ended.push(why);
    },
    onChange: () => undefined,
  });
  link.subscribe((event) => moves.heard('north', event));
  link.open();
  await clock.advance(3_000);
  const rig: GuidedRig = { labId: 'lab', rigId: 'north', name: 'North bench', document: { ...demoRigWide, motion }, motion };
  const asked = { rigId: 'north', sessionId: 's-1', userId: anna.id };
  /** Time goes by with the page open, which answers each beat of the stream after 120 ms. */
  const stay = async (seconds: number) => {
    for (let step = 0; step < seconds * 2; step += 1) {
      const beat = clock.monotonicMs();
      await clock.advance(120);
      if (moves.of('north') !== null) moves.seen(asked, beat);
      await clock.advance(380);
    }
  };
  const state = () => moves.of('north')?.state;
  return { clock, turntable, link, world, moves, rig, asked, stay, state, angle: () => turntable.trueAngleDegAt(clock.utcMs()) };
}

export type Bench = Awaited<ReturnType<typeof makeBench>>;

export async function begun(motion?: RigMotion, start?: { startDeg?: number; homed?: boolean }): Promise<Bench> {
  const bench = await makeBench(motion, start);
  bench.moves.begin(bench.rig, anna, 's-1');
  return bench;
}

export const nudge = (steps: number, intoKeepOut = false) => ({ kind: 'nudge', steps, intoKeepOut }) as const;

export const home = { kind: 'home', intoKeepOut: false } as const;

export function refusal(act: () => unknown): GuidedRefused {
  try {
    act();
  } catch (error) {
    if (error instanceof GuidedRefused) return error;
    throw error;
  }
  throw new Error('it was not refused');
}
