import type { BrokerStatus, BrokerTopic } from '@/shared/contracts/brokers';
import { matchesTopic } from '@/shared/lib/topic-filter';
import type { BrokerMessage, OpenBrokerLine } from '../interfaces/broker-line';
import type { Cancel, Clock } from '../interfaces/clock';
import type { BrokerRecord } from '../store/brokers';
import { readMessage } from './read-message';

const FIRST_WAIT_MS = 1_000;
const LONGEST_WAIT_MS = 60_000;
/** Samples that wait for the database. */
const MOST_WAITING = 20_000;
const SHOWN_PAYLOAD = 120;

const unreadable = 'its password was kept by a server with another key: give it again, or give all servers the same EVENFALL_SECRET_KEY';

interface FeedParts {
  broker: BrokerRecord;
  /** Null where it asks for none; undefined where this server cannot read it. */
  password: string | null | undefined;
  clock: Clock;
  open: OpenBrokerLine;
  samplesPerMinute: () => number;
}

/** What one broker sends: keeps the line up with growing pauses, reads its messages, and lets their samples wait to be fetched. */
export class BrokerFeed {
  private line: { close(): void } | null = null;
  private cancel: Cancel = () => undefined;
  private attempts = 0;
  private closed = false;
  private state: Pick<BrokerStatus, 'state' | 'since' | 'reason'>;
  private readonly topics: BrokerStatus['topics'];
  private waiting = new Map<string, Map<number, number>>();
  private count = 0;
  private minute: { fromMs: number; taken: number };

  constructor(private readonly parts: FeedParts) {
    this.state = { state: 'connecting', since: this.now(), reason: null };
    this.topics = parts.broker.topics.map(() => ({ taken: 0, refused: 0, last: null, lastRefused: null }));
    this.minute = { fromMs: parts.clock.monotonicMs(), taken: 0 };
    this.connect();
  }

  close(): void {
    this.closed = true;
    this.cancel();
    this.line?.close();
  }

  status(): BrokerStatus {
    return { ...this.state, toldAt: this.now(), topics: this.topics.map((topic) => ({ ...topic })) };
  }

  /** What came since, by channel; it waits here no more. */
  fetch(): Map<string, Map<number, number>> {
    const { waiting } = this;
    this.waiting = new Map();
    this.count = 0;
    return waiting;
  }

  /** Samples that could not be stored for the moment. */
  putBack(channel: string, samples: ReadonlyMap<number, number>): void {
    for (const [utcMs, value] of samples) {
      const known = this.waiting.get(channel)?.has(utcMs) === true;
      if (!known && this.count < MOST_WAITING) this.wait(channel, utcMs, value);
      else if (!known) this.refuse(this.indexOf(channel), '', 'came while the database was away, and no more can wait');
    }
  }

  refuseOf(channel: string, reason: string): void {
    this.refuse(this.indexOf(channel), '', reason);
  }

  private connect(): void {
    if (this.closed) return;
    const { broker, password } = this.parts;
    const { id, address, userName, ca, topics } = broker;
    if (password === undefined) {
      this.state = { state: 'away', since: this.state.since, reason: unreadable };
      return;
    }
    // 23 letters and digits at most: every broker takes them (MQTT 3.1.1, 3.1.3.1).
    const clientId = `evenfall${id.replaceAll('-', '').slice(0, 15)}`;
    const filters = [...new Set(topics.map(({ filter }) => filter))];
    this.line = this.parts.open(
      { address, clientId, userName, password, ca, filters },
      {
        connected: () => {
          this.attempts = 0;
          this.state = { state: 'connected', since: this.now(), reason: null };
        },
        away: (reason) => this.lost(reason),
        message: (message) => this.heard(message),
      },
    );
  }

  private lost(reason: string): void {
    if (this.closed) return;
    const since = this.state.state === 'away' ? this.state.since : this.now();
    this.state = { state: 'away', since, reason };
    this.cancel = this.parts.clock.after(Math.min(LONGEST_WAIT_MS, FIRST_WAIT_MS * 2 ** this.attempts), () => this.connect());
    this.attempts += 1;
  }

  private heard(message: BrokerMessage): void {
    if (this.closed) return;
    this.parts.broker.topics.forEach((topic, index) => {
      if (matchesTopic(topic.filter, message.topic)) this.take(topic, index, message);
    });
  }

  private take(topic: BrokerTopic, index: number, message: BrokerMessage): void {
    const status = this.topics[index];
    if (status === undefined) return;
    if (!this.mayTake()) {
      this.refuse(index, message.topic, `is one of more than ${String(this.parts.samplesPerMinute())} in a minute`);
      return;
    }
    const payload = Buffer.from(message.payload.subarray(0, 4 * SHOWN_PAYLOAD))
      .toString('utf8')
      .replaceAll('\0', '\uFFFD')
      .slice(0, SHOWN_PAYLOAD);
    status.last = { at: this.now(), topic: message.topic, payload };
    const read = readMessage(message, topic, this.parts.clock.utcMs());
    if (typeof read === 'string') {
      this.refuse(index, message.topic, read);
      return;
    }
    const known = this.waiting.get(topic.channel.name)?.get(read.utcMs);
    if (known !== undefined && known !== read.value)
      this.refuse(index, message.topic, 'has another value for the same instant than one before');
    else if (known === undefined && this.count >= MOST_WAITING)
      this.refuse(index, message.topic, 'came while the database was away, and no more can wait');
    else {
      if (known === undefined) this.wait(topic.channel.name, read.utcMs, read.value);
      status.taken += 1;
    }
  }

  private wait(channel: string, utcMs: number, value: number): void {
    const samples = this.waiting.get(channel) ?? new Map<number, number>();
    this.waiting.set(channel, samples.set(utcMs, value));
    this.count += 1;
  }

  private mayTake(): boolean {
    const nowMs = this.parts.clock.monotonicMs();
    if (nowMs - this.minute.fromMs >= 60_000) this.minute = { fromMs: nowMs, taken: 0 };
    this.minute.taken += 1;
    return this.minute.taken <= this.parts.samplesPerMinute();
  }

  private refuse(index: number, topic: string, reason: string): void {
    const status = this.topics[index];
    if (status === undefined) return;
    status.refused += 1;
    status.lastRefused = { at: this.now(), topic: topic.replaceAll('\0', '\uFFFD'), reason };
  }

  private indexOf(channel: string): number {
    return this.parts.broker.topics.findIndex((topic) => topic.channel.name === channel);
  }

  private now(): string {
    return new Date(this.parts.clock.utcMs()).toISOString();
  }
}
