import { assertFreshTap } from '@/server/http/begin-run';
import { actOnce, MemoryIdempotency, rethrowKeptProblem } from '@/server/http/idempotent';
import { ProblemError } from '@/server/http/problem-error';
import type { RunDriver } from '@/server/engine/run-driver';
import type { Answer } from '@/server/engine/run-driver-parts';
import type { IdempotencyAnswer, IdempotencyClaim, IdempotencyState } from '@/server/interfaces/idempotency';
import type { ProblemCode } from '@/shared/contracts/problem';
import type { RunView } from '@/shared/contracts/runs';
import { databaseAway, type SimulatedStore } from './simulated-store';
import type { World } from './world';

/** What a person asks of a run over a network, as it reaches the server. */
export interface Asked {
  act: 'hold' | 'stop' | 'resume' | 'view';
  /** Whose name the log is to say: another one for each tap. */
  by: string;
  key: string;
  tappedAt: string;
  /** When it was tapped, ms since the beginning, and what the server's clock was set by then. */
  tappedMs: number;
  stepMs: number;
}

export type Answered =
  | { kind: 'accepted'; serverAt: string }
  | { kind: 'problem'; code: ProblemCode; detail: string }
  | { kind: 'view'; serverUtcMs: number; state: RunView['state']; intervention: RunView['intervention'] };

/** Keys of what moves masses lie in the database: they outlive a process, and are away with it. */
class KeysInDatabase extends MemoryIdempotency {
  constructor(private readonly store: SimulatedStore) {
    super();
  }

  override async begin(claim: IdempotencyClaim): Promise<IdempotencyState> {
    this.reach();
    return super.begin(claim);
  }

  override async finish(claim: IdempotencyClaim, answer: IdempotencyAnswer): Promise<void> {
    this.reach();
    return super.finish(claim, answer);
  }

  override async release(claim: IdempotencyClaim): Promise<void> {
    this.reach();
    return super.release(claim);
  }

  private reach(): void {
    if (this.store.away) throw databaseAway();
  }
}

const LONGEST_TAKING_UP_MS = 20_000;
const LONGEST_KEEPING_MS = 1_000;
const LOOK_MS = 50;
const iso = (utcMs: number) => new Date(utcMs).toISOString();

/** What the server of a night answers people, as its routes do: each key once, a resume for 5 s, a stop also without a database. */
export class Answers {
  private readonly inDatabase: KeysInDatabase;
  private inProcess = { process: 0, keys: new MemoryIdempotency() };

  constructor(private readonly world: World) {
    this.inDatabase = new KeysInDatabase(world.store);
  }

  /** Null where there is no server, or it dies before it answers. */
  async answer(asked: Asked): Promise<Answered | null> {
    const { process, alive } = this.world;
    if (!alive) return null;
    const answered = await this.given(asked);
    return this.isStill(process) ? answered : null;
  }

  private async given(asked: Asked): Promise<Answered> {
    if (asked.act === 'view') return this.view();
    try {
      const claim = { userId: 'user-1', key: asked.key, fingerprint: asked.act };
      const answer = await actOnce(this.keysOf(asked.act), claim, async () => ({ status: 202, body: await this.act(asked), etag: null }));
      rethrowKeptProblem(answer);
      return { kind: 'accepted', serverAt: answer.body as string };
    } catch (error) {
      if (error instanceof ProblemError) return { kind: 'problem', code: error.code, detail: error.detail };
      return { kind: 'problem', code: 'database-away', detail: String(error) };
    }
  }

  private keysOf(act: Asked['act']): MemoryIdempotency {
    if (act === 'resume') return this.inDatabase;
    const { process } = this.world;
    if (this.inProcess.process !== process) this.inProcess = { process, keys: new MemoryIdempotency() };
    return this.inProcess.keys;
  }

  private view(): Answered {
    const { present, state, machineClock } = this.world;
    const { intervention = null, ...facts } = present?.facts() ?? { state: state as RunView['state'] };
    const known =
      intervention === null
        ? null
        : {
            kind: intervention.kind,
            by: intervention.by,
            serverAt: iso(intervention.serverAtUtcMs),
            confirmedAt: intervention.confirmedAtUtcMs === null ? null : iso(intervention.confirmedAtUtcMs),
          };
    return { kind: 'view', serverUtcMs: machineClock.utcMs(), state: facts.state, intervention: known };
  }

  /** Does it, and gives the server's time of it. */
  private async act(asked: Asked): Promise<string> {
    const { world } = this;
    const { process } = world;
    if (asked.act === 'stop' && world.over && world.state === 'stopped') return iso(world.machineClock.utcMs());
    const driver = await this.takenUp();
    if (asked.act === 'resume') return this.resume(driver, asked);
    const act = asked.act === 'stop' ? 'stop' : 'hold';
    // A repeat of what the log has already rests on what it came to then.
    const isRepeat = world.store.events.some(({ kind, data }) => kind === `${act}-requested` && data['by'] === asked.by);
    const answer = driver[act](asked.by, asked.key);
    const serverAt = await this.accepted(answer);
    if (!this.isStill(process)) return serverAt;
    if (!isRepeat) world.witness.halts.push({ kind: act, atMs: world.nowMs });
    world.witness.acknowledged.push({ act, by: asked.by });
    return serverAt;
  }

  private async resume(driver: RunDriver, { by, tappedAt, tappedMs, stepMs }: Asked): Promise<string> {
    const { world } = this;
    const { nowMs, machineClock } = world;
    const asked = { by, atMs: nowMs, ageMs: nowMs - tappedMs, setMs: Math.abs(machineClock.stepMs - stepMs), acted: false };
    world.witness.resumesFromAfar.push(asked);
    assertFreshTap(tappedAt, machineClock.utcMs(), 'resume');
    asked.acted = true;
    return this.accepted(await driver.resume(by));
  }

  /** The controller has it already; the answer waits until it is safe on a disk. */
  private async accepted(answer: Answer): Promise<string> {
    if (!answer.ok) throw new ProblemError('not-possible-now', answer.why);
    if (answer.kept !== undefined) await Promise.race([answer.kept, this.passes(LONGEST_KEEPING_MS)]);
    return iso(answer.serverAtUtcMs);
  }

  /** A server that has just begun may still be taking the run up. */
  private async takenUp(): Promise<RunDriver> {
    const { world } = this;
    for (let leftMs = LONGEST_TAKING_UP_MS; world.present === null && !world.over && leftMs > 0; leftMs -= LOOK_MS)
      await this.passes(LOOK_MS);
    if (world.present !== null) return world.present;
    throw new ProblemError('not-possible-now', world.over ? 'The run is over.' : 'No server drives this run at the moment.');
  }

  private isStill(process: number): boolean {
    return this.world.alive && this.world.process === process;
  }

  private passes(ms: number): Promise<void> {
    return new Promise((resolve) => void this.world.clock.after(ms, resolve));
  }
}
