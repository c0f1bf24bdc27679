import { wrongWith } from '../soak/run/checks';
import { runNight } from '../soak/run/night';
import { report } from './report';

/** Nights with faults from seeds, in one thread and without a database: how many a minute of one core's time. */

const nights = 300;
const warmUp = 20;
/** Half of them have people at the rig, who arm it and lay hands into it. */
const isArmed = (seed: number) => seed % 2 === 0;

async function run(): Promise<void> {
  let wrong = 0;
  for (let seed = 1; seed <= warmUp; seed += 1) await runNight(seed, { isArmed: isArmed(seed) });
  const before = process.cpuUsage();
  for (let seed = 1; seed <= nights; seed += 1) wrong += wrongWith(await runNight(seed, { isArmed: isArmed(seed) })).length;
  const { user, system } = process.cpuUsage(before);
  const minutes = (user + system) / 60e6;
  report({ name: 'simulated-nights', value: nights / minutes, unit: 'nights/min', goal: 1_000, want: 'at least', peer: null });
  report({ name: 'simulated-nights wrong', value: wrong, unit: 'violations', goal: 0, want: 'at most', peer: null });
}

void run();
