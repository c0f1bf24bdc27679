import { alarmKinds } from '@/shared/alarms/catalog';
import { calleesOf, nextCallee, type Callee } from '@/shared/alarms/rings';
import type { RunFacts } from '../../engine/run-facts';
import type { Cancel } from '../../interfaces/clock';
import { tellByHand, type Message } from '../../notify/tell';
import { alarmTimes, callMembersOf, callSettingsOf, type AlarmHop, type CallMember } from '../../store/calls';
import { pushDevicesOf, type PushDeviceRecord } from '../../store/push-devices';
import { findRun } from '../../store/runs-read';
import type { Services } from '../services';

/**
 * While the database is away no alarm can be stored and no job be asked for. Whom to ring for a run that is held meanwhile is therefore kept in
 * memory, refreshed while all is well, and they are rung from there.
 */

/** A hold that is over sooner needs nobody. */
const lastingMs = 60_000;

interface Known {
  labId: string;
  runId: string;
  rigName: string;
  timeZone: string;
  nextAfterMs: number;
  callees: Callee[];
  members: Map<string, CallMember & { devices: PushDeviceRecord[] }>;
}

export class OutageCall {
  private readonly known = new Map<string, Known>();
  private readonly rung = new Map<string, string[]>();
  private readonly hops: Omit<AlarmHop, 'alarmId' | 'occurrence'>[] = [];
  private cancel: Cancel = () => undefined;

  constructor(private readonly services: Services) {}

  /** Learns whom to ring for the runs that this process drives. */
  async refresh(): Promise<void> {
    const { db } = this.services.database;
    const runs = this.services.activeRuns.all();
    for (const runId of this.known.keys()) if (!runs.some(({ id }) => id === runId)) this.known.delete(runId);
    for (const { id: runId, labId, rigName } of runs) {
      const [settings, members, times, run] = await Promise.all([
        callSettingsOf(db, labId),
        callMembersOf(db, labId),
        alarmTimes(db, labId),
        findRun(db, labId, runId),
      ]);
      const callees = calleesOf(settings, members, run?.startedById ?? null);
      const reachable = new Map<string, CallMember & { devices: PushDeviceRecord[] }>();
      for (const member of members)
        if (callees.some(({ userId }) => userId === member.userId))
          reachable.set(member.userId, { ...member, devices: await pushDevicesOf(db, member.userId) });
      const nextAfterMs = settings.nextAfterMin * 60_000;
      this.known.set(runId, { labId, runId, rigName, timeZone: times.timeZone, nextAfterMs, callees, members: reachable });
    }
  }

  /** The database is away. */
  begin(): void {
    this.rung.clear();
    this.again(lastingMs);
  }

  /** It is back: what went out meanwhile, for the history of the alarm. */
  end(): Omit<AlarmHop, 'alarmId' | 'occurrence'>[] {
    this.cancel();
    return this.hops.splice(0);
  }

  stop(): void {
    this.cancel();
  }

  private again(afterMs: number): void {
    this.cancel = this.services.clock.after(afterMs, () => {
      this.services.background(this.ring(), 'ringing while the database is away');
    });
  }

  private async ring(): Promise<void> {
    const held = [...this.known.values()].flatMap((one) => {
      const facts = this.services.supervisor.driverOf(one.runId)?.facts();
      return facts?.state === 'held' ? [{ ...one, facts }] : [];
    });
    for (const one of held) await this.ringFor(one);
    this.again(held.length === 0 ? lastingMs : Math.min(...held.map(({ nextAfterMs }) => nextAfterMs)));
  }

  private async ringFor({ facts, ...one }: Known & { facts: RunFacts }): Promise<void> {
    const { clock, tell } = this.services;
    const at = clock.utcMs();
    const rung = this.rung.get(one.runId) ?? [];
    const next = nextCallee(one.callees, { ringing: 'always', utcMs: at, timeZone: one.timeZone, rung });
    const member = next === null ? undefined : one.members.get(next.userId);
    if (next === null || member === undefined) return;
    this.rung.set(one.runId, [...rung, next.userId]);
    const told = await tellByHand(tell, { email: member.email, devices: member.devices }, messageOf(one, facts));
    this.hops.push(...told.map((each) => ({ labId: one.labId, at, userId: next.userId, name: next.name, ...each })));
  }
}

function messageOf({ rigName, runId }: Known, { reason }: RunFacts): Message {
  return {
    title: `Run held, database away: ${rigName}`,
    paragraphs: [
      reason,
      `What it means: ${alarmKinds.held.consequence} ${alarmKinds['database-away'].consequence}`,
      `What to do: ${alarmKinds['database-away'].answer} Hold and stop work without it.`,
      'Nothing can be acknowledged while the database is away: the next person is rung as well.',
    ],
    path: `/runs/${runId}`,
    tag: `outage-${runId}`,
    quiet: false,
  };
}
