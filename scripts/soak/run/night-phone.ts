import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { observeServerTime, serverNowIso } from '@/components/api/device-clock';
import { ApiProblem } from '@/components/api/problem';
import { interventionReducer, spokenStage, stagesOf, type LocalIntervention } from '@/components/runs/intervention';
import { SafeActSender, type SafePost } from '@/components/runs/safe-acts';
import type { RunView } from '@/shared/contracts/runs';
import { Answers, type Answered, type Asked } from './answers';
import type { World } from './world';

/**
 * A person with a phone in a lift: holds, stops and resumes by the product's own client, over a network that loses what is asked or what is answered, brings it twice or
 * long after. All that is drawn for it comes from a stream of its own: the other faults of a seed are the same with it and without.
 */

const MOST_TAPS = 4;
const taps = ['hold', 'hold', 'hold', 'resume', 'resume', 'resume', 'resume', 'resume', 'stop'] as const;
/** Of each copy of what is sent. */
const PERCENT = { lostBefore: 25, lostAfter: 25, twice: 20, late: 15 } as const;
const ON_THE_WAY_MS = { usual: [30, 400], late: [1_000, 20_000] } as const;
const LOOK_MS = 2_000;
/** After a tap the page is looked at for so long. */
const LOOKED_AT_MS = 50_000;

export class NightPhone {
  private local: LocalIntervention = { kind: 'idle' };
  private known: Pick<RunView, 'state' | 'intervention'> | null = null;
  /** By key: whose name a tap has in the log. */
  private readonly names = new Map<string, string>();
  private looksUntilMs = -Infinity;
  private looking = false;
  private ended = false;
  private readonly between: (least: number, greatest: number) => number;
  private readonly answers: Answers;
  private readonly sender = new SafeActSender((action) => {
    this.local = interventionReducer(this.local, action);
    this.look();
  });

  constructor(
    private readonly world: World,
    seed: number,
  ) {
    const random = xoroshiro128plus(seed * 179_424_673 + 7);
    this.between = (least, greatest) => uniformInt(random, least, greatest);
    this.answers = new Answers(world);
  }

  /** Draws what will be tapped within `ms`, and hears what it did. */
  begin(ms: number, tell: (words: string) => void): void {
    const { clock } = this.world;
    for (let count = this.between(0, MOST_TAPS); count > 0; count -= 1) {
      const act = taps[this.between(0, taps.length - 1)] ?? 'hold';
      clock.after(this.between(0, ms), () => {
        if (this.ended) return;
        tell(`phone ${act}`);
        this.taps(act);
      });
    }
    // Whatever another night left behind is forgotten: this phone begins with the server's time.
    const nowMs = Date.now();
    for (const offMs of [1e9, 0])
      observeServerTime({ sentMs: nowMs, receivedMs: nowMs, serverMs: this.world.machineClock.utcMs() + offMs });
  }

  /** Nothing of what is on the way arrives any more. */
  end(): void {
    this.ended = true;
  }

  private taps(act: (typeof taps)[number]): void {
    this.looksUntilMs = this.world.nowMs + LOOKED_AT_MS;
    this.looks();
    if (act !== 'resume') return this.sender.tap(act, this.post);
    const key = `resume ${this.names.size}`;
    this.sends({ act, by: this.nameOf(key), key, tappedAt: serverNowIso() }, () => undefined);
  }

  private nameOf(key: string): string {
    const name = this.names.get(key) ?? `Ilse, tap ${this.names.size + 1}`;
    this.names.set(key, name);
    return name;
  }

  private readonly post: SafePost = (act, { body, idempotencyKey }) =>
    new Promise((resolve, reject) => {
      const asked = { act: act === 'stop' ? ('stop' as const) : ('hold' as const), by: this.nameOf(idempotencyKey), key: idempotencyKey };
      this.sends({ ...asked, ...body }, (answered) => {
        if (answered.kind === 'accepted') resolve({ data: { serverAt: answered.serverAt } });
        if (answered.kind === 'problem') {
          const { code, detail } = answered;
          reject(new ApiProblem({ type: '', title: code, status: 409, code, detail }));
        }
      });
    });

  private sends(asked: Omit<Asked, 'tappedMs' | 'stepMs'>, heard: (answered: Answered) => void): void {
    const { clock, nowMs, machineClock } = this.world;
    const whole = { ...asked, tappedMs: nowMs, stepMs: machineClock.stepMs };
    for (let copies = this.happens('twice') ? 2 : 1; copies > 0; copies -= 1) {
      const [lostBefore, lostAfter] = [this.happens('lostBefore'), this.happens('lostAfter')];
      const [thereMs, backMs] = [this.onTheWayMs(), this.onTheWayMs()];
      if (lostBefore) continue;
      clock.after(thereMs, () => {
        if (this.ended) return;
        void this.answers.answer(whole).then((answered) => {
          if (answered !== null && !lostAfter) clock.after(backMs, () => heard(answered));
        });
      });
    }
  }

  private looks(): void {
    if (this.looking) return;
    this.looking = true;
    const next = () => {
      this.looking = this.world.nowMs < this.looksUntilMs;
      if (!this.looking) return;
      const [sentMs, asked] = [Date.now(), { act: 'view' as const, by: '', key: '', tappedAt: '' }];
      this.sends(asked, (answered) => {
        if (answered.kind !== 'view') return;
        observeServerTime({ sentMs, receivedMs: Date.now(), serverMs: answered.serverUtcMs });
        this.known = answered;
        this.look();
      });
      this.world.clock.after(LOOK_MS, next);
    };
    next();
  }

  /** What the page says now; a standstill that it claims is noted. */
  private look(): void {
    const { known, world } = this;
    if (known === null) return;
    const stages = stagesOf(this.local, known.intervention, known.state);
    const says = stages === null ? '' : spokenStage(stages, String);
    if (says.startsWith('Stopped')) world.witness.stoppedSaid.push({ atMs: world.nowMs, angleDeg: world.angleDeg() });
  }

  private happens(what: keyof typeof PERCENT): boolean {
    return this.between(0, 99) < PERCENT[what];
  }

  private onTheWayMs(): number {
    const [least, greatest] = ON_THE_WAY_MS[this.happens('late') ? 'late' : 'usual'];
    return this.between(least, greatest);
  }
}
