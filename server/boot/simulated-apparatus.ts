import { CODATA_2022_G } from '@/shared/physics/constants';
import { createSimulatedBalance, type SimulatedBalance } from '@/shared/physics/simulated-balance';
import type { RigDocument, RigMotion } from '@/shared/rig/document';
import { travelWithTurns } from '@/shared/rig/travel';
import { feedSimulatedBalance } from '../ingest/simulated-balance';
import type { ByteLineFactory } from '../interfaces/byte-line';
import type { Cancel, Clock } from '../interfaces/clock';
import type { SeenRig, VirtualInputs } from '../interfaces/rig-stations';
import type { SampleBatch } from '../interfaces/sample-store';
import { createSimulatedController, type LightController, type SimulatedController } from '../links/simulated-controller';
import type { ApparatusMemory, ApparatusState } from './apparatus-memory';

export interface ApparatusParts {
  clock: Clock;
  rigId: string;
  document: RigDocument & { motion: RigMotion };
  /** Of the noise and of the controller's boot; another one at each first start. */
  seed: number;
  /** Null: nothing is remembered over a restart. A controller that lives longer keeps itself. */
  memory: ApparatusMemory | null;
  /** A controller that lives longer than this server; absent: one of its own. */
  controller?: SimulatedController;
}

export const simulatedRateHz = 10;

/** A simulated rig: the turntable's controller and the pendulum that its true angle drives, also between runs. */
export class SimulatedApparatus {
  readonly controller: SimulatedController;
  private readonly own: LightController | null;
  private balance: SimulatedBalance;
  private readonly born: { seed: number; uptimeS: number; atUtcMs: number };
  private sources: string;
  private loaded: RigDocument;
  private doorClosed = true;

  constructor(private readonly parts: ApparatusParts) {
    const { clock, document, seed, memory, rigId } = parts;
    const before = memory?.load(rigId) ?? null;
    this.born = bornFrom(before, seed, clock.utcMs());
    const place = before === null ? {} : { startDeg: within(document.motion, before.angleDeg), homed: before.positionKnown };
    const { seed: bootSeed, uptimeS } = this.born;
    this.own =
      parts.controller === undefined ? createSimulatedController({ clock, rig: document.motion, seed: bootSeed, uptimeS, ...place }) : null;
    this.controller = parts.controller ?? (this.own as LightController);
    this.sources = JSON.stringify(document.sources);
    this.loaded = document;
    this.balance = this.newBalance(document);
  }

  /** Arm key and door: nobody can go there and turn them. */
  get inputs(): VirtualInputs {
    const { controller } = this;
    return {
      turnKey: (on) => controller.turnArmKey(on),
      setDoor: (closed) => {
        this.doorClosed = closed;
        if (closed) controller.closeInterlock();
        else controller.openInterlock();
      },
    };
  }

  /** What a camera above it would see now. */
  seen(): SeenRig {
    const angleDeg = this.controller.trueAngleDegAt(this.parts.clock.utcMs());
    return { rig: this.loaded, angleDeg, doorClosed: this.doorClosed };
  }

  get factory(): ByteLineFactory {
    return this.controller.factory;
  }

  /** Puts another mass set on the turntable: the pendulum comes to rest with it. */
  load(document: RigDocument): void {
    const sources = JSON.stringify(document.sources);
    if (sources === this.sources) return;
    this.sources = sources;
    this.loaded = document;
    this.balance = this.newBalance(document);
  }

  /** Hands over what the readout has seen, once a second, until the returned function is called. */
  flow(take: (batch: SampleBatch) => void, onError: (error: unknown) => void): Cancel {
    const { clock } = this.parts;
    const feed = feedSimulatedBalance({
      clock,
      balance: { advance: (to) => this.balance.advance(to) },
      angleDegAt: this.controller.trueAngleDegAt,
      sink: (batch) => {
        take(batch);
        this.remember();
      },
      onError,
    });
    return () => feed.stop();
  }

  /** A table that moves is remembered where it would come to rest without this server, as a real one would. */
  private remember(): void {
    const { memory, clock, rigId } = this.parts;
    if (memory === null || this.own === null) return;
    const atUtcMs = clock.utcMs();
    const uptimeS = this.born.uptimeS + (atUtcMs - this.born.atUtcMs) / 1000;
    memory.save(rigId, { seed: this.born.seed, uptimeS, atUtcMs, ...this.own.ifLeft() });
  }

  private newBalance(document: RigDocument): SimulatedBalance {
    const { clock, seed } = this.parts;
    const nowUtcMs = clock.utcMs();
    return createSimulatedBalance({
      rig: document,
      bigG: CODATA_2022_G.value,
      seed,
      rateHz: simulatedRateHz,
      startUtcMs: nowUtcMs,
      startDeg: this.controller.trueAngleDegAt(nowUtcMs),
    });
  }
}

function bornFrom(before: ApparatusState | null, seed: number, nowUtcMs: number): { seed: number; uptimeS: number; atUtcMs: number } {
  if (before === null || before.atUtcMs > nowUtcMs) return { seed, uptimeS: 1, atUtcMs: nowUtcMs };
  return { seed: before.seed, uptimeS: before.uptimeS + (nowUtcMs - before.atUtcMs) / 1000, atUtcMs: nowUtcMs };
}

function within(motion: RigMotion, angleDeg: number): number {
  const { leastDeg, greatestDeg } = travelWithTurns(motion);
  return Math.min(greatestDeg, Math.max(leastDeg, angleDeg));
}
