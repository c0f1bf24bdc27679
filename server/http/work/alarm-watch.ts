import type { AlarmCode } from '@/shared/alarms/catalog';
import type { RunChange } from '../../engine/run-driver-parts';
import type { RunDriver } from '../../engine/run-driver';
import type { Cancel } from '../../interfaces/clock';
import type { RigStation } from '../../interfaces/rig-stations';
import type { LinkEvent } from '../../interfaces/turntable-link';
import { actOnAlarm, reportCondition, type AlarmPlace } from '../../store/alarms';
import { dueAlarms, metAlarms, standingAlarms } from '../../store/alarms-read';
import { writeHops } from '../../store/calls';
import { allRigs, type RigRecord } from '../../store/rigs';
import { channelsOfRun } from '../../store/runs-read';
import { lastSampleUtcMs } from '../../store/sample-summaries';
import type { Services } from '../services';
import { excursionCondition } from './channel-conditions';
import { heedEarlyEnd } from './early-end';
import { OutageCall } from './outage-call';
import { conditionsOf, isSlow, isWatched, runNowOf, type Condition } from './rig-conditions';
import { standingConditions } from './standing-conditions';
import { delayOf, isNews, keyOf, together } from './told-conditions';

/** How often the rigs are looked at when nothing happens, ms. */
const usualPaceMs = 5_000;
/** Every so many looks those that need the database too. */
const slowEvery = 6;
const leastFree = 0.1;

export interface WatchParts {
  services: Services;
  paceMs?: number | undefined;
  /** The disk of which the least part is free, and that part, 0 to 1; null where it cannot be told. */
  freeDisk(): Promise<{ disk: string; free: number } | null>;
}

type Place = Omit<AlarmPlace, 'labId'> & { labId: string };

/** What was last told of a place and holds there. */
interface Known {
  /** Delays, s, of those that the database believes to hold, by kind and subject; null before it was asked. */
  met: Map<string, number> | null;
  /** What the last look into the database found; null before there was one. */
  slow: Condition[] | null;
  /** Why they mean nothing now, as last told; undefined before it was. */
  suppressedWhy?: string | null;
}

/**
 * Looks at the rigs that this process drives and at the server itself, and takes into the database what has changed: which conditions hold
 * that did not, and which hold no more. What cannot be stored now is told at the next look.
 */
export class AlarmWatch {
  private readonly known = new Map<string, Known>();
  private readonly open = new Map<string, { interlock: boolean; supply: boolean }>();
  private readonly states = new Map<string, string>();
  private awaySinceUtcMs: number | null = null;
  private looks = 0;
  private cancel: Cancel = () => undefined;
  private stopped = false;
  private last: Promise<unknown> = Promise.resolve();
  private readonly outage: OutageCall;

  constructor(private readonly parts: WatchParts) {
    this.outage = new OutageCall(parts.services);
  }

  start(): void {
    this.parts.services.supervisor.onChange((driver, change) => this.runChanged(driver, change));
    this.next();
  }

  stop(): void {
    this.stopped = true;
    this.cancel();
    this.outage.stop();
  }

  /** The database does not answer since then; null: it does again. */
  noteDatabase(sinceUtcMs: number | null): void {
    const since = this.awaySinceUtcMs;
    this.awaySinceUtcMs = sinceUtcMs;
    if (sinceUtcMs !== null && since === null) this.outage.begin();
    if (sinceUtcMs === null && since !== null) this.soon(() => this.tellOutage(since));
  }

  /** What the line of a rig told, and whether somebody answered for the rig just before. */
  heard(station: RigStation, event: LinkEvent, wasArmed: boolean): void {
    const { rigId } = station;
    const open = this.open.get(rigId) ?? { interlock: false, supply: false };
    const busy = wasArmed || this.parts.services.supervisor.activeOf(rigId)?.isOver() === false;
    if (event.kind === 'interlock') open.interlock = !event.closed && (open.interlock || busy);
    if (event.kind === 'supply') open.supply = !event.present && (open.supply || busy);
    this.open.set(rigId, open);
    if (event.kind === 'clock-stepped') this.soon(() => this.tellStep(station, event));
    if (['interlock', 'supply', 'lost', 'ready', 'reset'].includes(event.kind)) this.soon(() => this.lookAt(station.labId, rigId));
  }

  /** Everything once, now; failures are logged. */
  async look(): Promise<void> {
    const { services } = this.parts;
    if (this.awaySinceUtcMs !== null) return;
    this.looks += 1;
    const slow = this.looks % slowEvery === 1;
    const rigs = await allRigs(services.database.db);
    const own = rigs.filter(({ id }) => services.stations.get(id) !== null);
    // What another process drives meanwhile is known to it alone.
    for (const { id } of rigs) if (!own.some((rig) => rig.id === id)) this.known.delete(id);
    for (const rig of own) {
      if (slow) await this.lookSlowly(rig);
      await this.lookAt(rig.labId, rig.id);
    }
    if (slow) await this.lookAtDisk([...new Set(own.map(({ labId }) => labId))]);
    if (slow) await this.outage.refresh();
    await this.passTime();
  }

  private next(): void {
    this.cancel = this.parts.services.clock.after(this.parts.paceMs ?? usualPaceMs, () => {
      this.soon(() => this.look());
      if (!this.stopped) this.next();
    });
  }

  /** One after the other: two looks at once would tell the same twice. */
  private soon(work: () => Promise<void>): void {
    if (this.stopped) return;
    const turn = this.last.then(work);
    this.last = turn.catch(() => undefined);
    this.parts.services.background(turn, 'a look for alarms');
  }

  private runChanged(driver: RunDriver, { facts, events }: RunChange): void {
    const state = `${facts.state} ${facts.reasonCode}`;
    if (this.states.get(driver.runId) === state) return;
    this.states.set(driver.runId, state);
    const { labId, rigId } = driver.parts.start;
    const ended = events.find(({ kind }) => kind === 'failed' || kind === 'stopped');
    const byPerson = facts.reasonCode === 'stopped-by-person';
    this.soon(async () => {
      if (ended !== undefined && !byPerson)
        await this.tellOnce({ labId, rigId, code: 'ended-early', subject: '' }, facts.reason, driver.runId);
      await this.lookAt(labId, rigId);
    });
    if (driver.isDone()) this.states.delete(driver.runId);
  }

  private async lookAt(labId: string, rigId: string): Promise<void> {
    const { services } = this.parts;
    const station = services.stations.get(rigId);
    if (station === null || this.awaySinceUtcMs !== null) return;
    const driver = services.supervisor.activeOf(rigId);
    const facts = driver === null || driver.isOver() ? null : driver.facts();
    const quarantined = services.supervisor.quarantinedOf(rigId);
    const known = await this.knownOf(labId, rigId);
    const found = conditionsOf({
      utcMs: services.clock.utcMs(),
      run: facts === null ? null : runNowOf(facts, driver?.parts.start.rig.measured?.period_s?.value ?? null),
      quarantined: quarantined === null ? null : { runId: quarantined.start.runId, why: quarantined.why },
      link: station.link.health(),
      linkWasReady: station.link.controller() !== null,
      open: this.open.get(rigId) ?? { interlock: false, supply: false },
      deflectionUtcMs: await this.deflectionUtcMs(labId, facts?.runId ?? null, station),
    });
    const lockedBy = facts === null ? services.locks.lockedBy(rigId) : null;
    await this.settle({ labId, rigId }, { known, found: together(found, known.slow ?? []), suppressedWhy: lockedBy });
  }

  private async lookSlowly(rig: RigRecord): Promise<void> {
    const { services } = this.parts;
    const { db } = services.database;
    const known = await this.knownOf(rig.labId, rig.id);
    const utcMs = services.clock.utcMs();
    const slow = await standingConditions(services.database, rig, {
      utcMs,
      isMet: (code, subject) => known.met?.has(keyOf({ code, subject })) === true,
    });
    const driver = services.supervisor.activeOf(rig.id);
    if (driver !== null && !driver.isOver()) {
      const facts = driver.facts();
      const active = services.activeRuns.find(rig.labId, facts.runId);
      const { timeZone = 'UTC' } = active?.run.start ?? {};
      slow.push(...(await heedEarlyEnd(db, driver, { labId: rig.labId, rigId: rig.id, timeZone })));
      const station = services.stations.get(rig.id);
      const channel = station === null ? null : await this.deflectionOf(rig.labId, facts.runId, station);
      if (channel !== null) slow.push(...(await excursionCondition(services.database, rig, { channel, utcMs, runId: facts.runId })));
    }
    known.slow = slow;
  }

  private async deflectionUtcMs(labId: string, runId: string | null, station: RigStation): Promise<number | null> {
    const channel = runId === null ? null : await this.deflectionOf(labId, runId, station);
    return channel === null ? null : lastSampleUtcMs(this.parts.services.database, { labId, channelId: channel.id });
  }

  /** The channel that the run is to be evaluated by, of the rig itself or of a device; null where that is not clear. */
  private async deflectionOf(labId: string, runId: string, station: RigStation): Promise<RigStation['channel']> {
    const { services } = this.parts;
    if (station.channel !== null) return station.channel;
    const run = services.activeRuns.find(labId, runId)?.run;
    if (run === undefined) return null;
    const wanted = run.start.protocol.evaluation?.channel;
    const channels = (await channelsOfRun(services.database.db, run)).filter(({ role }) => role === 'deflection');
    return channels.find(({ name }) => name === wanted) ?? (channels.length === 1 ? (channels[0] ?? null) : null);
  }

  private async lookAtDisk(labIds: readonly string[]): Promise<void> {
    const least = await this.parts.freeDisk();
    if (least === null) return;
    const words = `${String(Math.round(100 * least.free))} % of ${least.disk} is free.`;
    const found: Condition[] = least.free < leastFree ? [{ code: 'disk-low', subject: '', words, runId: null }] : [];
    for (const labId of labIds) {
      const known = await this.knownOf(labId, null);
      await this.settle({ labId, rigId: null }, { known, found, suppressedWhy: null, only: ['disk-low'] });
    }
  }

  /** Delays and shelves that are over. */
  private async passTime(): Promise<void> {
    const { services } = this.parts;
    const utcMs = services.clock.utcMs();
    const { db } = services.database;
    for (const { labId, id } of await dueAlarms(db, utcMs))
      await db.transaction((tx) => actOnAlarm(tx, { labId, alarmId: id }, { type: 'tick', utcMs }));
  }

  private async knownOf(labId: string, rigId: string | null): Promise<Known> {
    const key = rigId ?? labId;
    const known = this.known.get(key) ?? { met: null, slow: null };
    this.known.set(key, known);
    const { db } = this.parts.services.database;
    known.met ??= new Map((await metAlarms(db, labId, rigId)).map((alarm) => [keyOf(alarm), delayOf(alarm)]));
    return known;
  }

  /** Takes in what has changed since the last look. */
  private async settle(
    at: { labId: string; rigId: string | null },
    { known, found, suppressedWhy, only }: { known: Known; found: readonly Condition[]; suppressedWhy: string | null; only?: AlarmCode[] },
  ): Promise<void> {
    const utcMs = this.parts.services.clock.utcMs();
    const { met } = known;
    if (met === null) return;
    // Whoever began or ended to work at the rig changes what the same conditions mean.
    const toldAnew = known.suppressedWhy !== suppressedWhy;
    for (const condition of found) {
      if (!isNews(condition, met) && !toldAnew) continue;
      const { code, subject, sinceUtcMs, ...rest } = condition;
      await this.report({ ...at, code, subject }, { ...rest, met: true, suppressedWhy, sinceUtcMs, utcMs });
      met.set(keyOf(condition), delayOf(condition));
    }
    known.suppressedWhy = suppressedWhy;
    for (const key of [...met.keys()]) {
      const [code = '', ...subject] = key.split(' ');
      if (
        found.some((one) => keyOf(one) === key) ||
        !isWatched(code) ||
        (known.slow === null && isSlow(code)) ||
        (only !== undefined && !only.includes(code))
      )
        continue;
      await this.report({ ...at, code, subject: subject.join(' ') }, { met: false, words: '', runId: null, utcMs });
      met.delete(key);
    }
  }

  private report(place: Place, found: Parameters<typeof reportCondition>[2]): Promise<void> {
    return this.parts.services.database.db.transaction((tx) => reportCondition(tx, place, found));
  }

  private tellOnce(place: Place, words: string, runId: string | null = null): Promise<void> {
    return this.report(place, { met: true, words, runId, utcMs: this.parts.services.clock.utcMs() });
  }

  private async tellStep({ labId, rigId }: RigStation, { clock, byMs }: Extract<LinkEvent, { kind: 'clock-stepped' }>): Promise<void> {
    const whose = clock === 'host' ? 'The clock of the server' : 'The clock of the controller';
    await this.tellOnce({ labId, rigId, code: 'clock-stepped', subject: clock }, `${whose} jumped by ${String(Math.round(byMs))} ms.`);
  }

  /** Nothing could be stored while the database was away: the outage is written down when it is over. */
  private async tellOutage(sinceUtcMs: number): Promise<void> {
    const { services } = this.parts;
    const utcMs = services.clock.utcMs();
    const words = `The database did not answer for ${String(Math.round((utcMs - sinceUtcMs) / 1000))} s.`;
    const labIds = new Set(
      (await allRigs(services.database.db)).filter(({ id }) => services.stations.get(id) !== null).map(({ labId }) => labId),
    );
    const hops = this.outage.end();
    for (const labId of labIds) {
      const place = { labId, rigId: null, code: 'database-away' as const, subject: '' };
      await this.report(place, { met: true, words, runId: null, sinceUtcMs, utcMs });
      await this.report(place, { met: false, words, runId: null, utcMs });
      const alarm = (await standingAlarms(services.database.db, labId)).find(({ code }) => code === place.code);
      const own = hops.filter((hop) => hop.labId === labId);
      if (alarm === undefined || own.length === 0) continue;
      const { id: alarmId, snapshot } = alarm;
      await writeHops(
        services.database.db,
        own.map((hop) => ({ ...hop, alarmId, occurrence: snapshot.occurrence })),
      );
    }
  }
}
