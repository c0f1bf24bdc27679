import type { Logger } from 'pino';
import type { LinkSettings } from '@/shared/contracts/rigs';
import type { RigDocument } from '@/shared/rig/document';
import type { ByteLineFactory } from '../interfaces/byte-line';
import type { Cancel, Clock } from '../interfaces/clock';
import type { ListedPort } from '../interfaces/serial-ports';
import type { LiveSampleBatch, RigStation, RigStations, StationRig } from '../interfaces/rig-stations';
import type { SampleStore } from '../interfaces/sample-store';
import type { LinkEvent } from '../interfaces/turntable-link';
import { createLink } from '../links/link-driver';
import { listPorts } from '../links/port-list';
import { serialFactory } from '../links/serial-line';
import { tcpFactory } from '../links/tcp-line';
import { tryLink } from '../links/try-link';
import { findOrMakeChannel } from '../store/imports';
import type { Connection } from '../store/database';
import { SampleSink } from './sample-sink';
import { simulatedRateHz, type SimulatedApparatus } from './simulated-apparatus';

export interface StationsParts {
  database: Connection;
  samples: SampleStore;
  clock: Clock;
  /** The time that the run of a rig keeps to, in which its line tells instants. */
  clockOf(rigId: string): Clock;
  log: Logger;
  /** Samples of a channel are stored at most this often, ms; 0: as they come. */
  paceMs: number;
  /** The epoch under which this process drives a rig; null while another process holds its lease. */
  epochOf(rig: { labId: string; rigId: string }): Promise<number | null>;
  /** Lifts that epoch above another one; null while another process holds the lease. */
  raiseEpoch(rig: { labId: string; rigId: string }, above: number): Promise<number | null>;
  /** The turntable and pendulum of a simulated rig; the same for as long as the rig exists. */
  apparatusOf(rig: StationRig): SimulatedApparatus;
  /** What the controller of a rig says, whether or not a run listens. */
  onLinkEvent(station: RigStation, event: LinkEvent): void;
}

interface OpenStation extends RigStation {
  /** Ends what goes on between runs. */
  end(): void;
}

/** Lines to all rigs of this process, opened at the start and kept open. */
export class ServerRigStations implements RigStations {
  private readonly stations = new Map<string, OpenStation>();
  private readonly apparatus = new Map<string, SimulatedApparatus>();
  private readonly sinks = new Map<string, SampleSink>();
  private readonly listeners = new Set<(batch: LiveSampleBatch) => void>();

  constructor(private readonly parts: StationsParts) {}

  get(rigId: string): RigStation | null {
    return this.stations.get(rigId) ?? null;
  }

  async put(rig: StationRig): Promise<void> {
    await this.closeOne(rig.id);
    const { clock, log } = this.parts;
    const { motion } = rig.document;
    const epoch = await this.parts.epochOf({ labId: rig.labId, rigId: rig.id });
    if (motion === undefined || epoch === null) {
      if (motion === undefined) log.warn({ rigId: rig.id }, 'the rig has no motion data and is not driven');
      return;
    }
    const outside = factoryOf(rig.link, clock);
    const apparatus = outside === null ? this.parts.apparatusOf(rig) : null;
    const factory = outside ?? (apparatus as SimulatedApparatus).factory;
    const link = createLink({ factory, clock: this.parts.clockOf(rig.id), rig: motion, epoch });
    const channel = apparatus === null ? null : await this.simulatedChannel(rig);
    const virtual = apparatus?.inputs ?? null;
    const seen = apparatus === null ? null : () => apparatus.seen();
    const facts = { labId: rig.labId, rigId: rig.id, settings: rig.link, link, channel, virtual, seen };
    const station: OpenStation = { ...facts, end: () => undefined };
    const unsubscribe = link.subscribe((event) => this.parts.onLinkEvent(station, event));
    const endFlow = apparatus === null || channel === null ? () => undefined : this.flow(apparatus, station, channel);
    station.end = () => {
      unsubscribe();
      endFlow();
    };
    this.stations.set(rig.id, station);
    if (apparatus === null) this.apparatus.delete(rig.id);
    else this.apparatus.set(rig.id, apparatus);
    link.open();
  }

  async takeController(rig: { labId: string; rigId: string }, above: number): Promise<number | null> {
    const epoch = await this.parts.raiseEpoch(rig, above);
    if (epoch !== null) this.stations.get(rig.rigId)?.link.raiseEpoch(epoch);
    return epoch;
  }

  /** Another mass set lies on the turntable of a simulated rig from now on. */
  loadMasses(rigId: string, document: RigDocument): void {
    this.apparatus.get(rigId)?.load(document);
  }

  listPorts(): Promise<ListedPort[]> {
    return listPorts();
  }

  async tryLine(
    rig: Pick<StationRig, 'document'> & { id?: string },
    settings: LinkSettings,
  ): Promise<{ ok: boolean; detail: string; firmware: string | null }> {
    const { motion } = rig.document;
    if (motion === undefined)
      return { ok: false, detail: 'The rig document has no motion data (steps per degree, limits); enter them first.', firmware: null };
    const factory = factoryOf(settings, this.parts.clock);
    if (settings.kind === 'board')
      return { ok: true, detail: 'The emulated controller board is part of this server and always answers.', firmware: null };
    if (factory === null)
      return { ok: true, detail: 'The simulated turntable is part of this server and always answers.', firmware: 'simulated' };
    const own = this.openOn(settings);
    if (own !== null) return ownAnswer(own);
    return tryLink({ factory, clock: this.parts.clock });
  }

  onSamples(listener: (batch: LiveSampleBatch) => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  /** Resolves when all samples so far are stored, or were tried. */
  async idle(): Promise<void> {
    await Promise.all([...this.sinks.values()].map((sink) => sink.idle()));
  }

  async close(): Promise<void> {
    await Promise.all([...this.stations.keys()].map((rigId) => this.closeOne(rigId)));
  }

  async closeOne(rigId: string): Promise<void> {
    const station = this.stations.get(rigId);
    this.stations.delete(rigId);
    station?.end();
    await station?.link.close();
    await this.sinks.get(rigId)?.flush();
    this.sinks.delete(rigId);
  }

  private openOn(settings: LinkSettings): RigStation | null {
    return [...this.stations.values()].find((station) => isSameLine(station.settings, settings)) ?? null;
  }

  private async simulatedChannel(rig: StationRig): Promise<RigStation['channel']> {
    const wanted = {
      labId: rig.labId,
      rigId: rig.id,
      runId: null,
      name: 'deflection',
      quantity: 'pendulum angle',
      unit: 'rad',
      role: 'deflection' as const,
      source: 'simulated' as const,
      rateHz: simulatedRateHz,
      createdAt: this.parts.clock.utcMs(),
    };
    const channel = await findOrMakeChannel(this.parts.database.db, wanted);
    return { id: channel.id, name: channel.name, unit: channel.unit };
  }

  /** Lets the pendulum's deflection into its channel and to everybody who watches. */
  private flow(apparatus: SimulatedApparatus, station: RigStation, channel: NonNullable<RigStation['channel']>): Cancel {
    const { samples, clock, log, paceMs } = this.parts;
    const sink = new SampleSink({ samples, clock, log, paceMs }, { labId: station.labId, channelId: channel.id });
    this.sinks.set(station.rigId, sink);
    return apparatus.flow(
      (batch) => {
        sink.add(batch);
        for (const listener of this.listeners)
          listener({
            rigId: station.rigId,
            channelId: channel.id,
            channel: channel.name,
            unit: channel.unit,
            rateHz: simulatedRateHz,
            ...batch,
          });
      },
      (error) => log.error({ err: error, rigId: station.rigId }, 'the simulated balance failed'),
    );
  }
}

/** Null where the turntable is part of this server: that is no line that could be opened. */
function factoryOf(settings: LinkSettings, clock: Clock): ByteLineFactory | null {
  switch (settings.kind) {
    case 'serial':
      return serialFactory(settings, clock);
    case 'tcp':
      return tcpFactory(settings, clock);
    case 'simulated':
    case 'board':
      return null;
  }
}

function isSameLine(a: LinkSettings, b: LinkSettings): boolean {
  if (a.kind === 'serial') return b.kind === 'serial' && a.path === b.path;
  return a.kind === 'tcp' && b.kind === 'tcp' && a.host === b.host && a.port === b.port;
}

function ownAnswer(station: RigStation): { ok: boolean; detail: string; firmware: string | null } {
  const { condition, detail } = station.link.health();
  const firmware = station.link.controller()?.firmware ?? null;
  if (condition === 'ready')
    return { ok: true, detail: `This line is open and the controller answers, firmware ${firmware ?? 'unknown'}.`, firmware };
  return { ok: false, detail: `This line is open already, but the controller does not answer: ${detail}.`, firmware: null };
}
