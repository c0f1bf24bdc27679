import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { decodeLine, type EventMessage, type Reply, type Request } from '@/firmware-protocol/codec';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { LinkCommand, LinkEvent, TurntableLink } from '@/server/interfaces/turntable-link';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController, type SimulatedController } from '@/server/links/simulated-controller';
import type { RigMotion } from '@/shared/rig/document';
import { faultyLine, type FaultyLine } from './faulty-line';
import type { Situation } from './situations';

/** A quick turntable whose limits are as close to what is ordered as can be, so that nothing passes them unseen. */
export const soakRig: RigMotion = {
  stepsPerDegree: 100,
  minDeg: -60,
  maxDeg: 60,
  maxSpeed_deg_s: 30,
  maxAcceleration_deg_s2: 60,
  homeDeg: 0,
  homeSpeed_deg_s: 10,
};
export const crystal = { ratePpm: 18, uptimeS: 4321.5 };
export const startUtcMs = 946_684_800_000;
const SAMPLE_MS = 100;
const HEALED_MS = 30_000;
const END_MS = 62_000;

type At<T> = T & { atMs: number };

/** What a night left behind, for the checkers: what was ordered, what arrived, what the controller did and said, where the table truly was. */
export interface Night {
  issued: At<{ command: LinkCommand }>[];
  arrived: At<{ request: Request }>[];
  replies: At<{ reply: Reply }>[];
  did: At<{ event: EventMessage; trueDeg: number }>[];
  told: At<{ event: LinkEvent }>[];
  samples: At<{ angleDeg: number }>[];
  /** Interlock opened, supply lost, controller restarted. */
  hazards: At<{ kind: 'interlock' | 'supply' | 'reset' }>[];
  /** Stretches in which an input forbade motion, ms. */
  forbidden: { kind: 'interlock' | 'supply'; fromMs: number; toMs: number }[];
  /** Lines as somebody wrote them, and as they came out at the other end. */
  line: Pick<FaultyLine, 'written' | 'arrived'>;
  slippedSteps: number;
  uptimeS: number;
  condition: string;
}

/** What a situation may do to its night. */
export interface Scene {
  clock: VirtualClock;
  controller: SimulatedController;
  night: Night;
  link: TurntableLink;
  upTo(greatest: number): number;
  at(ms: number, deed: () => void): void;
  lease: { mayRenew: boolean };
  onMove(deed: () => void): void;
  interject(line: string): void;
}

const settle = async () => {
  for (let turn = 0; turn < 8; turn += 1) await null;
};

/** Moves, a hold, a stop and a homing on a line or a machine with faults; from half time on everything is whole again. */
export async function runNight(situation: Situation, seed: number): Promise<Night> {
  const clock = new VirtualClock(startUtcMs, settle);
  const random = xoroshiro128plus(seed * 7919 + 17);
  const uptimeS = situation.uptimeS ?? crystal.uptimeS;
  const night = emptyNight(uptimeS);
  let onMove: () => void = () => undefined;
  const nowMs = () => clock.monotonicMs();
  const sentOnce = new Set<number>();
  const controller: SimulatedController = createSimulatedController({
    ...{ clock, rig: soakRig, seed, ratePpm: crystal.ratePpm, uptimeS },
    tap: {
      arrived: (line) => {
        const item = decodeLine(line);
        if (item.kind !== 'request') return;
        night.arrived.push({ request: item, atMs: nowMs() });
        if (item.order.word === 'move') onMove();
      },
      sent: (line) => {
        const item = decodeLine(line.slice(0, -1));
        if (item.kind === 'reply') night.replies.push({ reply: item, atMs: nowMs() });
        if (item.kind !== 'event') return;
        if (item.what.word === 'boot') sentOnce.clear();
        // An event that is read again is the same event.
        if (sentOnce.has(item.number)) return;
        sentOnce.add(item.number);
        night.did.push({ event: item, trueDeg: controller.trueAngleDegAt(clock.utcMs()), atMs: nowMs() });
      },
    },
  });
  const line = faultyLine(controller.factory, clock, { fault: situation.line ?? 'drop', seed, share: situation.share });
  night.line = { written: line.written, arrived: line.arrived };
  const link = createLink({ factory: line.factory, clock, rig: soakRig, epoch: 7 });
  const lease = { mayRenew: true };
  link.subscribe((event) => night.told.push({ event, atMs: nowMs() }));
  link.setLeaseRule(() => lease.mayRenew);
  link.open();
  const at = (ms: number, deed: () => void) => void clock.after(ms, deed);
  const upTo = (greatest: number) => uniformInt(random, 0, greatest);
  const issue = (command: LinkCommand) => {
    night.issued.push({ command, atMs: nowMs() });
    link.send(command);
  };
  sample({ clock, controller, night });
  order(at, issue, { seed, clock });
  situation.act?.({ clock, controller, night, link, upTo, at, lease, onMove: (deed) => (onMove = deed), interject: line.interject });
  await clock.advance(HEALED_MS);
  line.heal();
  lease.mayRenew = true;
  await clock.advance(END_MS - HEALED_MS);
  night.condition = link.health().condition;
  await link.close();
  return night;
}

function emptyNight(uptimeS: number): Night {
  const lists = { issued: [], arrived: [], replies: [], did: [], told: [], samples: [], hazards: [], forbidden: [] };
  return { ...lists, line: { written: new Set(), arrived: [] }, slippedSteps: 0, uptimeS, condition: '' };
}

function sample({ clock, controller, night }: Pick<Scene, 'clock' | 'controller' | 'night'>): void {
  night.samples.push({ angleDeg: controller.trueAngleDegAt(clock.utcMs()), atMs: clock.monotonicMs() });
  clock.after(SAMPLE_MS, () => sample({ clock, controller, night }));
}

function order(
  at: (ms: number, deed: () => void) => void,
  issue: (command: LinkCommand) => void,
  { seed, clock }: { seed: number; clock: VirtualClock },
): void {
  const move = (id: string, targetDeg: number, aheadMs: number | null) =>
    issue({
      kind: 'move',
      id,
      targetDeg,
      speedDegS: 30,
      accelerationDegS2: 60,
      startUtcMs: aheadMs === null ? null : clock.utcMs() + aheadMs,
    });
  at(3_000, () => move('one', 40, 1_500));
  at(9_000, () => move('two', -40, null));
  at(9_000 + 200 * (seed % 20), () => issue({ kind: 'hold', id: 'hold' }));
  at(16_000, () => move('three', 60, 1_000));
  at(16_000 + 150 * (seed % 30), () => issue({ kind: 'stop', id: 'stop', releaseDrivers: false }));
  at(24_000, () => move('four', 0, null));
  at(36_000, () => issue({ kind: 'home', id: 'five' }));
  at(58_000, () => move('six', 12, null));
}
