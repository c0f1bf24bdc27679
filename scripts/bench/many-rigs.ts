import { fork } from 'node:child_process';
import { join } from 'node:path';
import { LEAD_MS } from '@/server/engine/timing';
import { LabClient, pause } from './lib/lab-client';
import { manyRigs, type BenchRig } from './lib/more-rigs';
import { addMembers } from './lib/people';
import { withServerHere, type ServerHere } from './lib/server-here';
import { swingsWith } from './lib/swings';
import { growth, quantile, report } from './report';

/**
 * Up to 100 simulated rigs in one process, each with a run whose steps follow every 10 s and a deflection of 10 samples a second, on a real
 * database. Lateness of a step is how far its motion begins, by the controller's clock, from the instant that was planned. Command is from the
 * instant at which the order for it was due, 1.5 s before that, until it leaves on the line: it waits until the database has stored the order,
 * so a disk that stalls shows here first; its peer is a process that does nothing but wait. What is left of the 1.5 s keeps the motion punctual,
 * so this has no goal of its own. Stored is how long after the controller's edge the step is in the database and acted on: people see it then,
 * and no motion waits for it.
 */

const sizes = [25, 50, 100];
const settlingMs = 5_000;
const measuredMs = 30_000;
const dwellS = 10;

interface Figures {
  lateMs: number[];
  motionMs: number[];
  storedMs: number[];
  /** Share of one core. */
  core: number;
  /** What the timers of an idle process were late by, ms. */
  bareMs: number[];
}

/** When the command that a rig was given last, and has not sent yet, was due; UTC ms by rig. */
type Due = Map<string, number>;

/** Takes down when each move that is sent ahead was due. */
function noteDue({ server }: ServerHere, rigs: readonly BenchRig[], due: Due): void {
  for (const { id } of rigs) {
    const link = server.services.stations.get(id)?.link;
    if (link === undefined) throw new Error('a rig of the benchmark has no line');
    const send = link.send.bind(link);
    link.send = (command) => {
      if (command.kind === 'move' && command.startUtcMs !== null) due.set(id, command.startUtcMs - LEAD_MS);
      send(command);
    };
  }
}

async function watch({ server, clock }: ServerHere, lateMs: number[]): Promise<Figures> {
  await pause(settlingMs);
  lateMs.length = 0;
  const [motionMs, storedMs, bareMs]: [number[], number[], number[]] = [[], [], []];
  const peer = fork(join(__dirname, 'lib', 'bare-timer.ts'), [], { execArgv: ['--import', 'tsx'] });
  peer.on('message', (late) => bareMs.push(...(late as number[])));
  const leave = server.services.supervisor.onChange((_, { steps, events }) => {
    const nowMs = clock.utcMs();
    for (const { kind, at } of events) if (kind === 'step-began') storedMs.push(nowMs - Date.parse(at));
    for (const { kind, startUtcMs, plannedStartUtcMs, outcome } of steps)
      if (kind === 'swing' && outcome === null) motionMs.push(Math.abs(startUtcMs - plannedStartUtcMs));
  });
  const [before, beganMs] = [process.cpuUsage(), performance.now()];
  await pause(measuredMs);
  const { user, system } = process.cpuUsage(before);
  const core = (user + system) / 1000 / (performance.now() - beganMs);
  leave();
  peer.disconnect();
  return { lateMs: [...lateMs], motionMs, storedMs, core, bareMs };
}

async function measure(here: ServerHere, rigs: readonly BenchRig[], lateMs: number[]): Promise<void> {
  const [cookie] = await addMembers(here.database, 'operator');
  const points: { size: number; cost: number }[] = [];
  let running = 0;
  for (const size of sizes) {
    for (; running < size; running += 1) {
      const lab = new LabClient(here.address, cookie, rigs[running]);
      await lab.arm();
      await lab.start(await lab.issue(swingsWith(dwellS)));
    }
    const { core, bareMs, ...found } = await watch(here, lateMs);
    const p99 = (name: string, values: readonly number[]) =>
      ({ name: `many-rigs ${String(size)} ${name}`, value: quantile(values, 0.99), unit: 'ms p99' }) as const;
    report({ ...p99('lateness', found.motionMs), goal: 20, want: 'at most', peer: null });
    report({ ...p99('command', found.lateMs), goal: null, want: 'told', peer: quantile(bareMs, 0.99) });
    report({ ...p99('stored', found.storedMs), goal: null, want: 'told', peer: null });
    report({ name: `many-rigs ${String(size)} core`, value: 100 * core, unit: '% of a core', goal: 60, want: 'at most', peer: null });
    points.push({ size, cost: core });
  }
  report({ name: 'many-rigs growth', value: growth(points), unit: 'exponent', goal: 1.2, want: 'at most', peer: null });
}

async function run(): Promise<void> {
  const due: Due = new Map();
  const lateMs: number[] = [];
  let rigs: BenchRig[] = [];
  const ear = (rigId: string, { order }: { order: { word: string } }) => {
    const dueMs = due.get(rigId);
    if (order.word !== 'move' || dueMs === undefined) return;
    lateMs.push(Date.now() - dueMs);
    due.delete(rigId);
  };
  const prepare = async (database: ServerHere['database']) => void (rigs = await manyRigs(database, Math.max(...sizes)));
  await withServerHere({ ear, prepare }, async (here) => {
    noteDue(here, rigs, due);
    await measure(here, rigs, lateMs);
  });
}

void run();
