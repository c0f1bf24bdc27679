import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { callOnce } from '@/components/api/call-once';
import { call } from '@/components/api/client';
import { deviceNowMs, serverNowIso } from '@/components/api/device-clock';
import {
  interventionReducer,
  spokenStage,
  stagesOf,
  type InterventionAction,
  type LocalIntervention,
} from '@/components/runs/intervention';
import { liveReducer, noLive, type LiveAction } from '@/components/runs/live-reducer';
import { openLiveStream } from '@/components/runs/live-stream';
import { postOfRun, SafeActSender } from '@/components/runs/safe-acts';
import { resumeRun } from '@/shared/contracts/going-on';
import { getRun } from '@/shared/contracts/runs';
import type { SeededKinds } from '../seeded/try-seeds';
import { FaultyNetwork, phoneFaults, type PhoneFault } from './faulty-network';
import { LabSide } from './lab-side';
import { VirtualTime } from './virtual-time';

const params = { labId: 'lab-1', runId: 'run-1' };
const beganUtcMs = Date.UTC(2031, 2, 13, 21);
/** What the phone's idea of the server's time may be wrong by, ms. */
const clockMs = 300;
/** A resume counts for 5 s after the tap; a stop is sent for 30 s. */
const countsForMs = { resume: 5000, stop: 30_000 };
const pollMs = 2000;
const silentMs = 5000;

/** The page of a run without its picture: the product's own client, fed by a network and a clock that are invented. */
class Phone {
  local: LocalIntervention = { kind: 'idle' };
  live = noLive;
  resumed: 'not tapped' | 'sent' | 'done' | 'not done' = 'not tapped';
  readonly wrong: string[] = [];
  /** Highest number of the chain that the stream has told without a gap. */
  private knownSeq = 0;
  private readonly sender = new SafeActSender((action: InterventionAction) => {
    this.local = interventionReducer(this.local, action);
    this.look();
  });

  constructor(
    private readonly time: VirtualTime,
    private readonly lab: LabSide,
  ) {}

  /** A message of the stream, as it came. */
  heard = (type: string, id: number | null, data: string): void => {
    if (type === 'snapshot') this.knownSeq = Math.max(this.knownSeq, (JSON.parse(data) as { lastSeq: number }).lastSeq);
    if (type !== 'event' || id === null) return;
    if (id > this.knownSeq + 1) this.wrong.push(`event ${String(id)} came after ${String(this.knownSeq)} without a snapshot between`);
    this.knownSeq = Math.max(this.knownSeq, id);
  };

  opens(): void {
    openLiveStream('/api/labs/lab-1/runs/run-1/live', {
      onMessage: (message) => this.learns({ kind: 'messages', messages: [message] }),
      onOpen: () => this.learns({ kind: 'opened' }),
      onBroken: () => this.learns({ kind: 'broken' }),
    });
    this.polls();
  }

  private polls(): void {
    this.time.onPhone(pollMs, () => {
      const { heardAtMs, missed } = this.live;
      if (missed || heardAtMs === null || deviceNowMs() - heardAtMs > silentMs)
        call(getRun, { params }).then(
          ({ data }) => this.learns({ kind: 'loaded', view: data, rows: [] }),
          () => undefined,
        );
      this.polls();
    });
  }

  private learns(action: LiveAction): void {
    this.live = liveReducer(this.live, action);
    this.look();
  }

  /** What the page says of the three stages; empty while there is nothing to say. */
  says(): string {
    const stages = this.live.view === null ? null : stagesOf(this.local, this.live.view.intervention, this.live.view.state);
    return stages === null ? '' : spokenStage(stages, String);
  }

  private look(): void {
    const claims = this.live.view?.state === 'stopped' || this.says().startsWith('Stopped');
    if (claims && this.lab.stoodStillAtMs === null) this.wrong.push(`"${this.says()}" before the controller stood still`);
  }

  taps(act: 'resume' | 'stop'): void {
    if (act === 'stop') return this.sender.tap('stop', postOfRun(params));
    this.resumed = 'sent';
    callOnce(resumeRun, { params, body: { tappedAt: serverNowIso(), reviewToken: 'reviewed' } }).then(
      () => (this.resumed = 'done'),
      () => (this.resumed = 'not done'),
    );
  }
}

interface Bout {
  fault: PhoneFault;
  /** From the tap to the beginning of the fault, and how long it lasts, ms. */
  fromMs: number;
  lastsMs: number;
}

const isMidTap = (fault: PhoneFault) => fault === 'flight mode mid-tap' || fault === 'frozen tab';

/** A tap with its fault around it, and 10 s in which all is well again. Returns when it was tapped, ms UTC. */
async function bout(act: 'resume' | 'stop', { phone, network, time }: Scene, { fault, fromMs, lastsMs }: Bout): Promise<number> {
  const begins = () => {
    if (fault === 'frozen tab') time.freeze(lastsMs);
    // Every other phone that sleeps has no network either.
    if (fault !== 'frozen tab' || fromMs % 2 === 0) network.become(fault === 'frozen tab' ? 'offline' : fault);
  };
  if (fromMs < 0) {
    begins();
    await time.pass(-fromMs);
  }
  const tappedAtMs = time.utcMs();
  phone.taps(act);
  if (fromMs >= 0) {
    await time.pass(fromMs);
    begins();
  }
  await time.pass(lastsMs);
  network.become(null);
  await time.pass(Math.max(0, countsForMs[act] - lastsMs) + 10_000);
  return tappedAtMs;
}

interface Scene {
  time: VirtualTime;
  lab: LabSide;
  network: FaultyNetwork;
  phone: Phone;
}

/** What is wrong after a resume that was tapped. */
function wrongResume({ lab, network, phone }: Scene, tappedAtMs: number): string[] {
  const posts = network.posts.filter(({ act }) => act === 'resume');
  const late = lab.resumedAtMs.filter((atMs) => atMs > tappedAtMs + countsForMs.resume + clockMs);
  return [
    ...(posts.length === 1 ? [] : [`a resume was sent ${String(posts.length)} times`]),
    ...(late.length === 0 ? [] : [`a resume moved masses ${String((late[0] ?? 0) - tappedAtMs)} ms after the tap`]),
    ...(phone.resumed === 'done' && lab.resumedAtMs.length !== 1 ? ['a resume that never came was called done'] : []),
    ...(phone.resumed === 'sent' ? ['nobody was told what became of a resume'] : []),
  ];
}

/** What is wrong after a stop that was tapped, with its fault over before the last attempt or not. */
function wrongStop({ lab, network, phone }: Scene, { tappedAtMs, lastsMs }: { tappedAtMs: number; lastsMs: number }): string[] {
  const posts = network.posts.filter(({ act }) => act === 'stop');
  const acted = lab.stopsActedOn.length;
  const late = posts.filter(({ atMs }) => atMs > tappedAtMs + countsForMs.stop);
  const says = phone.says();
  return [
    ...(acted <= 1 ? [] : [`a stop was acted on ${String(acted)} times`]),
    ...(acted === 0 && lastsMs < countsForMs.stop - 2000 ? [`a stop did not come, ${String(lastsMs)} ms without a network`] : []),
    ...(late.length === 0 ? [] : [`a stop was sent ${String((late[0]?.atMs ?? 0) - tappedAtMs)} ms after the tap`]),
    ...(new Set(posts.map(({ key }) => key)).size <= 1 ? [] : ['one tap was sent under two keys']),
    ...(acted === 1 && !says.startsWith('Stopped') ? [`it stands still and the page says: ${says}`] : []),
    ...(acted === 0 && !says.includes('No answer in 30 s') ? [`the stop never came and the page says: ${says}`] : []),
  ];
}

/**
 * One phone at a held run, from a seed: resume is tapped, later stop, each with the fault around it. Returns what was wrong: "Stopped" before the
 * controller stood still, a motion later than 5 s after its tap, an act done twice, a gap in the stream without a snapshot.
 */
export async function tryPhone(fault: PhoneFault, seed: number): Promise<string[]> {
  const generator = xoroshiro128plus(seed * 7919 + 31);
  const upTo = (greatest: number) => uniformInt(generator, 0, greatest);
  const random = () => upTo(1e6) / 1e6;
  const time = new VirtualTime(beganUtcMs);
  const lab = new LabSide(time, random);
  const network = new FaultyNetwork({ time, lab, random });
  const phone = new Phone(time, lab);
  const scene = { time, lab, network, phone };
  const { fetch: realFetch, EventSource: realSource } = globalThis;
  Object.assign(globalThis, { fetch: network.fetch, EventSource: network.eventSource(phone.heard) });
  const some = (): Bout => ({ fault, fromMs: isMidTap(fault) ? upTo(150) : -upTo(3000), lastsMs: 1000 + upTo(45_000) });
  try {
    return await time.asOfThePhone(async () => {
      phone.opens();
      await time.pass(6000 + upTo(1000));
      const wrong = wrongResume(scene, await bout('resume', scene, some()));
      const around = some();
      const tappedAtMs = await bout('stop', scene, around);
      wrong.push(...wrongStop(scene, { tappedAtMs, lastsMs: around.lastsMs }), ...phone.wrong);
      return wrong.map((words) => `${fault}, seed ${String(seed)}: ${words}`);
    });
  } finally {
    Object.assign(globalThis, { fetch: realFetch, EventSource: realSource });
  }
}

export const phoneKinds: SeededKinds = Object.fromEntries(
  phoneFaults.map((fault) => [fault, { attempt: (seed: number) => tryPhone(fault, seed), first: 25, second: 500 }]),
);
