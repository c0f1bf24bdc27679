import type { ChainedEvent, ChannelSeries, RunStart, SimulatedRun, StepRow } from '@/shared/archive/run-records';
import { createSimulatedBalance } from '@/shared/physics/simulated-balance';
import { motionOf } from '@/shared/protocol/durations';
import type { SampleReader } from '../../interfaces/sample-reader';
import type { TurntableLink } from '../../interfaces/turntable-link';
import { MemoryJournal } from '../memory-journal';
import { RunDriver } from '../run-driver';
import type { RunFacts } from '../run-facts';
import { VirtualClock } from '../virtual-clock';
import { DeflectionSeries } from './deflection';
import { drawnRig } from './drawn-rig';
import { scheduleFaults, SERVER_AWAY_MS } from './rehearsal-faults';
import { ReadoutFaults } from './readout-faults';
import type { RehearsalParts } from './rehearsal-parts';
import { RehearsalStore } from './rehearsal-store';

export interface RehearsalInput {
  /** With `simulated` set: the recipe. */
  start: RunStart & { simulated: SimulatedRun };
  startUtcMs: number;
}

/** What a rehearsal leaves, all in memory. */
export interface Rehearsal {
  outcome: 'finished' | 'held' | 'stopped' | 'failed';
  facts: RunFacts;
  steps: StepRow[];
  events: ChainedEvent[];
  channels: ChannelSeries[];
  startedAtUtcMs: number | null;
  endedAtUtcMs: number;
  /** Simulated time from the start to the end, s. */
  simulatedS: number;
  holds: number;
}

/** The link is opened this long before the start, so that the run begins on the second. */
const PREPARE_MS = 3_000;
/** The pendulum is worked out in pieces of this length. */
const SAMPLE_BATCH_MS = 1_000;
/** Longer than 10,000 steps of any use; a protocol that waits for ever ends here. */
const LONGEST_MS = 400 * 86_400_000;

/**
 * Runs a protocol on the simulated rig: the engine, the link and the bytes of a real run, on a clock that jumps. There is nobody to
 * resume, so a hold that does not end by itself ends it. The same input gives the same result.
 */
export async function rehearse({ start, startUtcMs }: RehearsalInput, parts: RehearsalParts): Promise<Rehearsal> {
  const { simulated, rig } = start;
  const motion = motionOf(rig);
  const clock = new VirtualClock(startUtcMs - PREPARE_MS, parts.settle);
  const controller = parts.createController({ clock, rig: motion, seed: simulated.seed });
  const deflection = new DeflectionSeries();
  const server = new RehearsalServer(start, {
    ...parts,
    clock,
    samples: deflection.reader,
    newLink: (epoch) => parts.createLink({ factory: controller.factory, clock, rig: motion, epoch }),
  });
  await clock.advance(PREPARE_MS);

  const actual = simulated.drawGeometry === true ? drawnRig(rig, simulated.seed) : { rig, angleDeg: (countedDeg: number) => countedDeg };
  const angleDegAt = (utcMs: number) => actual.angleDeg(controller.trueAngleDegAt(utcMs));
  const startDeg = actual.angleDeg(motion.homeDeg);
  const balance = createSimulatedBalance({
    rig: actual.rig,
    startDeg,
    bigG: simulated.trueG,
    seed: simulated.seed,
    rateHz: simulated.rateHz,
    startUtcMs,
  });
  const readout = new ReadoutFaults();
  const sample = () => deflection.append(readout.spoil(balance.advance({ toUtcMs: clock.utcMs(), angleDegAt })));
  const sampleOn = () => {
    sample();
    clock.after(SAMPLE_BATCH_MS, sampleOn);
  };
  clock.after(SAMPLE_BATCH_MS, sampleOn);
  scheduleFaults(simulated.faults, { clock, controller, readout, killServer: () => server.kill() });
  server.begin();
  await clock.advance(LONGEST_MS, () => server.hasEnded());
  sample();
  return result(server, deflection.series());
}

function result(server: RehearsalServer, series: ChannelSeries): Rehearsal {
  const { driver, store, nowUtcMs } = server;
  const snapshot = driver.state();
  const { startedAtUtcMs, endedAtUtcMs } = snapshot.context;
  const outcome = snapshot.state === 'finished' || snapshot.state === 'stopped' || snapshot.state === 'failed' ? snapshot.state : 'held';
  const endUtcMs = endedAtUtcMs ?? nowUtcMs;
  const facts = driver.facts();
  server.close();
  return {
    outcome,
    facts,
    steps: store.steps(),
    events: [...store.events],
    channels: [series],
    startedAtUtcMs,
    endedAtUtcMs: endUtcMs,
    simulatedS: (endUtcMs - (startedAtUtcMs ?? endUtcMs)) / 1000,
    holds: store.events.filter(({ kind }) => kind === 'held').length,
  };
}

interface ServerParts extends RehearsalParts {
  clock: VirtualClock;
  samples: SampleReader;
  newLink(epoch: number): TurntableLink;
}

/** The process that drives the run: it can be killed, and another takes the run up from what was saved. */
class RehearsalServer {
  readonly store: RehearsalStore;
  private readonly journal = new MemoryJournal();
  private link: TurntableLink;
  private present: RunDriver | null = null;
  private epoch = 1;
  private away = false;

  constructor(
    private readonly start: RunStart,
    private readonly parts: ServerParts,
  ) {
    this.store = new RehearsalStore(start);
    this.link = this.openLink();
  }

  /** The driver that has the run, or had it last. */
  get driver(): RunDriver {
    if (this.present === null) throw new Error('the rehearsal has not begun');
    return this.present;
  }

  begin(): void {
    this.present = this.newDriver(null);
    this.present.start();
  }

  get nowUtcMs(): number {
    return this.parts.clock.utcMs();
  }

  hasEnded(): boolean {
    return !this.away && (this.driver.isOver() || this.driver.state().state === 'held');
  }

  /** As SIGKILL would: nothing is said, nothing saved. */
  kill(): void {
    if (this.away) return;
    this.away = true;
    this.close();
    this.parts.clock.after(SERVER_AWAY_MS, () => void this.comeBack());
  }

  close(): void {
    this.driver.close();
    void this.link.close();
  }

  private async comeBack(): Promise<void> {
    this.epoch += 1;
    this.link = this.openLink();
    this.present = this.newDriver(await this.store.load());
    this.away = false;
    this.present.recover();
  }

  private openLink(): TurntableLink {
    const link = this.parts.newLink(this.epoch);
    link.open();
    return link;
  }

  private newDriver(stored: Awaited<ReturnType<RehearsalStore['load']>>): RunDriver {
    const { clock, sha256, samples } = this.parts;
    return new RunDriver({
      start: this.start,
      stored,
      store: this.store,
      journal: this.journal,
      link: this.link,
      clock,
      sha256,
      samples,
      armNow: () => null,
      perform: () => undefined,
    });
  }
}
