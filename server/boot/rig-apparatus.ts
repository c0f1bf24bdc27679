import { randomBytes } from 'node:crypto';
import { join } from 'node:path';
import type { Logger } from 'pino';
import type { RigMotion } from '@/shared/rig/document';
import type { StationRig } from '../interfaces/rig-stations';
import { createEmulatedController } from '../links/board/board-controller';
import type { SimulatedController } from '../links/simulated-controller';
import { ApparatusMemory } from './apparatus-memory';
import type { BuildParts } from './build-parts';
import { RealClock } from './real-clock';
import { ScaledClock } from './scaled-clock';
import { SimulatedApparatus } from './simulated-apparatus';
import { createWorkerBoard } from './worker-board';

interface Made {
  key: string;
  apparatus: SimulatedApparatus;
  end(): Promise<void>;
}

const nothingToEnd = async () => undefined;

/** The turntables and pendulums that are part of this server: one for each rig, for the life of the server. */
export class RigApparatus {
  private readonly made = new Map<string, Made>();
  private readonly memory: ApparatusMemory | null;

  constructor(
    private readonly parts: BuildParts,
    private readonly log: Logger,
  ) {
    const { config } = parts;
    this.memory = config.mode === 'test' ? null : new ApparatusMemory(join(config.stateDir, 'simulated'));
  }

  /** The one of a rig whose line leads into this server; a new one when its document or its line is another. */
  of(rig: StationRig): SimulatedApparatus {
    const key = JSON.stringify([rig.link.kind, rig.document]);
    const known = this.made.get(rig.id);
    if (known?.key === key) return known.apparatus;
    void known?.end();
    const made = { key, ...this.make(rig) };
    this.made.set(rig.id, made);
    return made.apparatus;
  }

  async end(): Promise<void> {
    await Promise.all([...this.made.values()].map((one) => one.end()));
    this.made.clear();
  }

  private make(rig: StationRig): Omit<Made, 'key'> {
    const { clock, overrides = {} } = this.parts;
    const { motion } = rig.document;
    if (motion === undefined) throw new Error('a simulated rig needs motion data');
    const seed = randomBytes(3).readUIntBE(0, 3);
    const given = overrides.controllerOf?.(rig);
    const own = given === undefined && rig.link.kind === 'board' ? this.board(rig.id, motion, seed) : null;
    const controller = given ?? own?.controller;
    const apparatus = new SimulatedApparatus({
      clock,
      rigId: rig.id,
      document: { ...rig.document, motion },
      seed,
      // A board keeps itself.
      memory: own === null ? this.memory : null,
      ...(controller === undefined ? {} : { controller }),
    });
    return { apparatus, end: own?.end ?? nothingToEnd };
  }

  /** In a thread of its own in real time, also where that is scaled; on a virtual clock in this thread. */
  private board(rigId: string, rig: RigMotion, seed: number): { controller: SimulatedController; end(): Promise<void> } {
    const { clock, config } = this.parts;
    if (!(clock instanceof RealClock || clock instanceof ScaledClock))
      return { controller: createEmulatedController({ clock, rig, seed, homed: false }), end: nothingToEnd };
    const file = config.mode === 'test' ? null : join(config.stateDir, 'board', `${rigId.replaceAll(/[^\w-]/g, '')}.bin`);
    return createWorkerBoard({ rig, seed, file }, { clock, log: this.log });
  }
}
