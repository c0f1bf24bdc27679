import { alarmKinds } from '@/shared/alarms/catalog';
import { calleesOf, nextCallee, triedAgainMs, type Callee } from '@/shared/alarms/rings';
import type { RunFacts } from '../../engine/run-facts';
import type { Cancel } from '../../interfaces/clock';
import { tellByHand, worthAnotherTry, type Message, type Told } from '../../notify/tell';
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

type Held = Known & { facts: RunFacts };

/** How far the ringing for a run has come. */
interface Call {
  /** Whom a message reached. */
  reached: string[];
  /** How often all who were left were tried in vain. */
  rounds: number;
  /** When somebody is rung next. */
  dueUtcMs: number;
}

export class OutageCall {
  private readonly known = new Map<string, Known>();
  private readonly calls = new Map<string, Call>();
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
    this.calls.clear();
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
    const nowUtcMs = this.services.clock.utcMs();
    const waits = held.map(({ runId }) => (this.calls.get(runId)?.dueUtcMs ?? 0) - nowUtcMs);
    this.again(Math.max(1000, Math.min(lastingMs, ...waits)));
  }

  /** The next who can be reached; where nobody can, all who are left are tried again later. */
  private async ringFor(one: Held): Promise<void> {
    const call = this.calls.get(one.runId) ?? { reached: [], rounds: 0, dueUtcMs: 0 };
    this.calls.set(one.runId, call);
    if (call.dueUtcMs > this.services.clock.utcMs()) return;
    const missed: string[] = [];
    let mayGo = false;
    call.dueUtcMs = Infinity;
    for (let next = this.nextOf(one, [...call.reached, ...missed]); next !== null; next = this.nextOf(one, [...call.reached, ...missed])) {
      const told = await this.tell(one, next);
      const nowUtcMs = this.services.clock.utcMs();
      if (told.some(({ outcome }) => outcome === 'sent')) {
        call.reached.push(next.userId);
        call.dueUtcMs = nowUtcMs + one.nextAfterMs;
        return;
      }
      missed.push(next.userId);
      mayGo ||= worthAnotherTry(told) !== null;
    }
    const againMs = mayGo ? triedAgainMs(call.rounds, call.reached.length > 0) : null;
    call.rounds += 1;
    if (againMs !== null) call.dueUtcMs = this.services.clock.utcMs() + againMs;
  }

  private nextOf(one: Held, rung: readonly string[]): Callee | null {
    const utcMs = this.services.clock.utcMs();
    const callees = one.callees.filter(({ userId }) => one.members.has(userId));
    return nextCallee(callees, { ringing: 'always', utcMs, timeZone: one.timeZone, rung });
  }

  private async tell({ facts, ...one }: Held, { userId, name }: Callee): Promise<Told[]> {
    const { clock, tell } = this.services;
    const { email, devices } = one.members.get(userId) ?? { email: '', devices: [] };
    const at = clock.utcMs();
    const told = await tellByHand(tell, { email, devices }, messageOf(one, facts));
    this.hops.push(...told.map((each) => ({ labId: one.labId, at, userId, name, ...each })));
    return told;
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
