import { randomUUID } from 'node:crypto';
import { hostname, uptime } from 'node:os';
import { join } from 'node:path';
import type { Logger } from 'pino';
import type { Arming } from '../engine/arming';
import { KeyTurns } from '../engine/key-turns';
import type { RunStart } from '@/shared/archive/run-records';
import { GuidedMoves } from '../engine/guided-moves';
import { MotorSoak } from '../engine/motor-soak';
import type { NoticeTopic } from '../engine/run-context';
import { type QuarantinedRun, RigSupervisor } from '../engine/rig-supervisor';
import { DATABASE_GRACE_MS } from '../engine/run-saver';
import { SteadyClock } from '../engine/steady-clock';
import { sha256Hex } from '../evaluation/sha256';
import type { Clock } from '../interfaces/clock';
import type { RigStation } from '../interfaces/rig-stations';
import type { SampleReader } from '../interfaces/sample-reader';
import type { SampleStore } from '../interfaces/sample-store';
import type { LinkEvent } from '../interfaces/turntable-link';
import { isPassing } from '../store/failures';
import { createRunStore } from '../store/run-store';
import { createStandingStore } from '../store/standing-store';
import type { MemoryArmKeeper } from './arm-keeper';
import type { Background } from './background';
import type { BuildParts } from './build-parts';
import { buildStanding } from './build-standing';
import { FileJournals } from './file-journal';
import { heedLinks, performing } from './heed-links';
import { LeaseKeeper, type RigKey } from './lease-keeper';
import type { MemoryLockKeeper } from './lock-keeper';
import { ProcessMarks } from './process-marks';
import { RigApparatus } from './rig-apparatus';
import { ServerRigStations } from './rig-stations';
import { StandingFiles } from './standing-files';

const shortestLeaseMs = 3_000;
const serverName = `process ${String(process.pid)} of ${hostname()}`;

export interface RigSideWiring {
  /** Of this process: on its leases. */
  holder: string;
  log: Logger;
  background: Background;
  samples: SampleStore;
  samplesOf(rigId: string): SampleReader;
  onLine(rigId: string): void;
  /** A rig that another process drove is this one's now. */
  onTaken(rig: RigKey): void;
  /** The database does not answer since then; null: it does again. */
  onDatabase(sinceUtcMs: number | null): void;
  /** A run cannot be taken up by this server. */
  onQuarantine(run: QuarantinedRun): void;
  /** What a run has to say to whoever started it. */
  onNotice(start: RunStart, notice: { topic: NoticeTopic; text: string }): void;
  /** What a line told, and whether the rig was armed just before. */
  onLinkEvent(station: RigStation, event: LinkEvent, wasArmed: boolean): void;
}

export interface RigSide {
  arms: MemoryArmKeeper;
  arming: Arming;
  keyTurns: KeyTurns;
  locks: MemoryLockKeeper;
  leases: LeaseKeeper;
  stations: ServerRigStations;
  supervisor: RigSupervisor;
  guided: GuidedMoves;
  apparatus: RigApparatus;
  soak: MotorSoak;
}

const processMarks = (stateDir: string, log: Logger) =>
  new ProcessMarks(join(stateDir, 'processes'), (error) =>
    log.warn({ err: error }, 'what is known of other servers of this machine could not be read or written'),
  );

/** All that has to do with the rigs: who may move them, their lines, and the engine that drives runs. */
export function buildRigSide(parts: BuildParts, wiring: RigSideWiring): RigSide {
  const { log, background, samples, samplesOf, onLine, onTaken, onDatabase, onLinkEvent } = wiring;
  const { engineDatabase: database = parts.database, clock, overrides = {} } = parts;
  const linkOf = (rigId: string) => stations.get(rigId)?.link ?? null;
  const { arms, arming, locks } = buildStanding({
    ...{ clock, log, background, onLine, linkOf, newId: randomUUID },
    ...keptStanding(parts),
    exitDelayMsOf: (rigId) => exitDelayMs(parts, stations.get(rigId)),
    supervisor: () => supervisor,
    guided: (): GuidedMoves => guided,
  });
  const clockOf = steadyClocks(clock, (rigId) => supervisor.drives(rigId));
  const processes = processMarks(parts.config.stateDir, log);
  if (parts.config.roles.includes('rig')) processes.leave(wiring.holder, clock.utcMs());
  const leases = new LeaseKeeper({
    ...{ database, clock, log, onTaken, processes },
    holder: wiring.holder,
    leaseMs: Math.max(shortestLeaseMs, overrides.paceMs ?? 0),
    graceMs: DATABASE_GRACE_MS,
    onLost: letGo,
    onDatabase: (sinceUtcMs) => {
      supervisor.noteDatabase(sinceUtcMs);
      onDatabase(sinceUtcMs);
    },
  });
  const [apparatus, soak] = [new RigApparatus(parts, log), new MotorSoak()];
  const stations = new ServerRigStations({
    ...{ database, samples, clock, clockOf, log },
    paceMs: overrides.paceMs ?? 0,
    epochOf: (rig) => leases.epochOf(rig),
    raiseEpoch: (rig, above) => leases.raise(rig, above),
    apparatusOf: (rig) => apparatus.of(rig),
    onLinkEvent: (station, event) => heed(station, event),
  });
  const supervisor: RigSupervisor = new RigSupervisor({
    store: createRunStore(database.db, wiring.holder),
    journals: overrides.journals ?? new FileJournals(join(parts.config.stateDir, 'journal')),
    ...{ clock, clockOf, sha256: sha256Hex, serverName, linkOf },
    armOf: (rigId) => arms.armOf(rigId),
    whyDisarmed: (rigId) => arms.endedOf(rigId)?.why ?? '',
    lockedBy: (rigId) => locks.lockedBy(rigId),
    guidedBy: (rigId) => guided.takenBy(rigId),
    samplesOf,
    perform: performing(arms, wiring.onNotice),
    isPassing,
    onQuarantine: (run) => {
      log.error({ runId: run.start.runId, rigId: run.start.rigId }, run.why);
      wiring.onQuarantine(run);
    },
    onError: (error, { runId, rigId }) => log.error({ err: error, runId, rigId }, 'a run went wrong'),
  });

  const [guided, keyTurns] = [buildGuided({ clock, linkOf, arms, locks, onLine, supervisor }), new KeyTurns(clock)];
  const heed = heedLinks({ arms, arming, guided, soak, keyTurns }, { log, onLinkEvent, nowUtcMs: () => clock.utcMs() });

  /** Two drivers on one rig would be worse than none. */
  function letGo({ rigId }: RigKey): void {
    supervisor.letGo(rigId);
    guided.letGo(rigId);
    background.add(stations.closeOne(rigId), 'closing a line');
  }

  return { arms, arming, keyTurns, locks, leases, stations, supervisor, guided, apparatus, soak };
}

/** What outlives this process of arms and locks: in the database, and on this disk until that has it. */
const keptStanding = ({ database, engineDatabase = database, overrides = {}, config }: BuildParts) => ({
  store: createStandingStore(engineDatabase, sha256Hex),
  standing: overrides.standing ?? new StandingFiles(join(config.stateDir, 'standing')),
});

/** The time of each rig: one that its run keeps to. */
function steadyClocks(clock: Clock, drives: (rigId: string) => boolean): (rigId: string) => Clock {
  const clocks = new Map<string, Clock>();
  // Linux counts sleep in the one and not in the other (clock_gettime(2): CLOCK_BOOTTIME, CLOCK_MONOTONIC).
  const slept = () => 1000 * uptime() - clock.monotonicMs();
  return (rigId) => {
    const known = clocks.get(rigId) ?? new SteadyClock(clock, () => drives(rigId), slept);
    clocks.set(rigId, known);
    return known;
  };
}

function buildGuided(parts: {
  clock: BuildParts['clock'];
  linkOf: (rigId: string) => RigStation['link'] | null;
  arms: RigSide['arms'];
  locks: RigSide['locks'];
  onLine: (rigId: string) => void;
  supervisor: RigSupervisor;
}): GuidedMoves {
  const { clock, linkOf, arms, locks, onLine, supervisor } = parts;
  return new GuidedMoves({
    ...{ clock, linkOf },
    armOf: (rigId) => arms.armOf(rigId),
    takenBy: (rigId) => supervisor.takenBy(rigId),
    lockedBy: (rigId) => locks.lockedBy(rigId),
    endArm: (rig, why, by) => arms.end(rig, why, by),
    onChange: onLine,
  });
}

/** The exit delay of product.md: 2 min for every real rig. */
const exitDelayOfRealRigsMs = 120_000;

/** A rig that is part of this server has nobody in its room; how long its delay takes is configured. */
function exitDelayMs({ config, overrides = {} }: BuildParts, station: RigStation | null): number {
  return station?.virtual == null ? (overrides.exitDelayMs ?? exitDelayOfRealRigsMs) : 1000 * config.virtualExitDelayS;
}
