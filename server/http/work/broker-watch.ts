import { BrokerFeed } from '@/server/ingest/broker-feed';
import type { OpenBrokerLine } from '@/server/interfaces/broker-line';
import type { Cancel } from '@/server/interfaces/clock';
import { allBrokers, sealPassword, tellBrokerStatus, type BrokerRecord } from '@/server/store/brokers';
import { ConflictingBatchError, storeBatches } from '@/server/store/device-tokens';
import { isPassing } from '@/server/store/failures';
import { channelsOfRig, type ChannelRecord } from '@/server/store/imports';
import { ThinnedSamplesError } from '@/server/store/thinned-error';
import { readPassword } from '../kept-password';
import type { Services } from '../services';

/** Where no broker is listened to: whether there is one now, ms. */
const NONE_MS = 5_000;
/** What is heard is told at least so often, ms. */
const TELL_MS = 15_000;
/** Samples of one channel that are refused one by one before the rest of the batch is. */
const MOST_REFUSED = 20;

/** What is listened to and how: another one is another line. */
const wayOf = ({ address, userName, password, ca, topics }: BrokerRecord) => JSON.stringify([address, userName, password, ca, topics]);

interface Held {
  broker: BrokerRecord;
  way: string;
  feed: BrokerFeed;
  told: string;
  toldAtMs: number;
}

interface WatchParts {
  services: Services;
  /** Whether this process drives the rig: it alone listens, or stamps of arrival would differ. */
  holds(rigId: string): boolean;
  open: OpenBrokerLine;
  paceMs?: number | undefined;
}

/** Listens to the brokers of the rigs of this process and stores what they send, as what devices send. */
export class BrokerWatch {
  private readonly held = new Map<string, Held>();
  private cancel: Cancel = () => undefined;
  private stopped = false;
  private turn: Promise<void> = Promise.resolve();

  constructor(private readonly parts: WatchParts) {}

  start(): void {
    if (this.stopped) return;
    const { services, paceMs = 1_000 } = this.parts;
    this.cancel = services.clock.after(this.held.size === 0 ? Math.max(paceMs, NONE_MS) : paceMs, () => {
      this.turn = this.look()
        .catch((error: unknown) => services.log.warn({ err: error }, 'the brokers could not be looked at'))
        .then(() => this.start());
    });
  }

  async stop(): Promise<void> {
    this.stopped = true;
    this.cancel();
    await this.turn;
    for (const { feed } of this.held.values()) feed.close();
    await this.storeAll().catch((error: unknown) => this.parts.services.log.warn({ err: error }, 'what brokers sent last is lost'));
    this.held.clear();
  }

  private async look(): Promise<void> {
    const { services, holds, open } = this.parts;
    const { clock, config } = services;
    await this.storeAll();
    const wanted = (await allBrokers(services.database.db)).filter(({ rigId }) => holds(rigId));
    await this.leave(wanted);
    for (const broker of this.stopped ? [] : wanted) {
      if (this.held.has(broker.id)) continue;
      const password = await readPassword(services, { of: 'broker', ...broker }, (sealed) =>
        sealPassword(services.database.db, broker, sealed),
      );
      const feed = new BrokerFeed({ broker, password, clock, open, samplesPerMinute: () => config.devices.samplesPerMinute });
      this.held.set(broker.id, { broker, way: wayOf(broker), feed, told: '', toldAtMs: 0 });
    }
    for (const held of this.held.values()) await this.tell(held);
  }

  /** Closes the lines that are not wanted, or not in this way; what they brought last is stored. */
  private async leave(wanted: readonly BrokerRecord[]): Promise<void> {
    const left = [...this.held].filter(([id, { way }]) => !wanted.some((broker) => broker.id === id && wayOf(broker) === way));
    if (left.length === 0) return;
    for (const [, { feed }] of left) feed.close();
    await this.storeAll();
    for (const [id] of left) this.held.delete(id);
  }

  private async storeAll(): Promise<void> {
    for (const { broker, feed } of this.held.values()) {
      const waiting = feed.fetch();
      if (waiting.size === 0) continue;
      const rest = new Map(waiting);
      try {
        const channels = (await channelsOfRig(this.parts.services.database.db, broker.labId, broker.rigId)).filter(
          ({ runId }) => runId === null,
        );
        for (const [name, samples] of waiting) {
          const channel = channels.find((each) => each.name === name);
          if (channel === undefined) feed.refuseOf(name, 'goes into a channel that is not there any more');
          else await this.store(feed, channel, samples);
          rest.delete(name);
        }
      } catch (error) {
        for (const [name, samples] of rest)
          if (isPassing(error)) feed.putBack(name, samples);
          else feed.refuseOf(name, 'could not be stored');
        throw error;
      }
    }
  }

  /** What is stored with another value already is refused, the rest is stored. */
  private async store(feed: BrokerFeed, channel: ChannelRecord, samples: Map<number, number>): Promise<void> {
    const { services } = this.parts;
    for (let refused = 0; refused <= MOST_REFUSED && samples.size > 0; refused += 1) {
      const sorted = [...samples].sort(([a], [b]) => a - b);
      const batch = { utcMs: Float64Array.from(sorted, ([utcMs]) => utcMs), value: Float64Array.from(sorted, ([, value]) => value) };
      try {
        await storeBatches(services.database, channel.labId, [{ ...batch, channelId: channel.id }]);
        services.arrived(channel.rigId, { ...channel, channelId: channel.id }, batch);
        return;
      } catch (error) {
        if (error instanceof ThinnedSamplesError) {
          feed.refuseOf(channel.name, 'lies where the channel was thinned to its summaries; nothing is added there');
          for (const utcMs of samples.keys()) if (utcMs >= error.fromUtcMs && utcMs < error.toUtcMs) samples.delete(utcMs);
          continue;
        }
        if (!(error instanceof ConflictingBatchError)) throw error;
        feed.refuseOf(channel.name, 'has another value than was stored for that instant; a sample is never changed');
        if (!samples.delete(error.atUtcMs)) break;
      }
    }
    if (samples.size > 0)
      feed.refuseOf(
        channel.name,
        `came with too many others that differ from what is stored; ${String(samples.size)} samples were not stored`,
      );
  }

  private async tell(held: Held): Promise<void> {
    const { clock, database } = this.parts.services;
    const { toldAt, ...facts } = held.feed.status();
    const told = JSON.stringify(facts);
    const nowMs = clock.monotonicMs();
    if (told === held.told && nowMs - held.toldAtMs < TELL_MS) return;
    await tellBrokerStatus(database.db, held.broker, { ...facts, toldAt });
    Object.assign(held, { told, toldAtMs: nowMs });
  }
}
