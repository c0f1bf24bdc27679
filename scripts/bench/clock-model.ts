import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { ClockModel } from '@/server/links/clock-model';
import { quantile, report } from './report';

/**
 * 200 trials of three minutes: 60 exchanges with a controller whose crystal runs 50 ppm fast, over a line at 115200 bit/s.
 * Each way has a small delay of its own that never changes, one that scatters, and now and then a long one from a host
 * that was busy; their sizes are those of a loaded machine (common practice, no source). The unchanging difference of the
 * two ways cannot be seen by any model: it is part of the stated uncertainty, as a rectangle, which k = 2 covers wholly.
 */

const trials = 200;
const exchanges = 60;
const spanMs = 180_000;
const ratePpm = 50;
const byteMs = 10_000 / 115_200;
const [outMs, inMs, turnMs] = [23 * byteMs, 76 * byteMs, 0.1];
const greatestSteadyMs = 0.1;
const scatterMs = 0.4;
const busyShare = 0.05;
const greatestBusyMs = 20;

interface Trial {
  offsetMs: number;
  driftPpm: number;
  uMs: number;
}

function trial(seed: number): Trial {
  const random = xoroshiro128plus(seed);
  const uniform = () => uniformFloat64(random);
  const bootMs = 1e7 * uniform();
  const controllerMs = (hostMs: number) => bootMs + hostMs * (1 + ratePpm * 1e-6);
  const [steadyOutMs, steadyInMs] = [greatestSteadyMs * uniform(), greatestSteadyMs * uniform()];
  const lateMs = () => -scatterMs * Math.log(1 - uniform()) + (uniform() < busyShare ? greatestBusyMs * uniform() : 0);
  const model = new ClockModel();
  for (let k = 0; k < exchanges; k += 1) {
    const t1Ms = (k * spanMs) / exchanges;
    const receivedMs = t1Ms + outMs + steadyOutMs + lateMs();
    const [t2Us, t3Us] = [receivedMs, receivedMs + turnMs].map((hostMs) => Math.round(controllerMs(hostMs) * 1000)) as [number, number];
    model.add({ t1Ms, t2Us, t3Us, t4Ms: receivedMs + turnMs + inMs + steadyInMs + lateMs(), outMs, inMs });
  }
  const now = model.offsetAt(spanMs);
  const slope = (now.ms - model.offsetAt(0).ms) / spanMs;
  return { offsetMs: Math.abs(now.ms - (controllerMs(spanMs) - spanMs)), driftPpm: Math.abs(slope * 1e6 - ratePpm), uMs: now.uMs };
}

const results = Array.from({ length: trials }, (_, index) => trial(index + 1));
const covered = results.filter(({ offsetMs, uMs }) => offsetMs <= 2 * uMs).length;
const p95 = (of: (one: Trial) => number) => quantile(results.map(of), 0.95);
const meanSquare = results.reduce((sum, { offsetMs, uMs }) => sum + (offsetMs / uMs) ** 2, 0) / trials;
report({ name: 'clock-model offset', value: p95(({ offsetMs }) => offsetMs), unit: 'ms p95', goal: 0.2, want: 'at most', peer: null });
report({ name: 'clock-model drift', value: p95(({ driftPpm }) => driftPpm), unit: 'ppm p95', goal: 1, want: 'at most', peer: null });
report({ name: 'clock-model coverage', value: covered, unit: `of ${String(trials)}`, goal: [181, 199], want: 'within', peer: null });
report({ name: 'clock-model error/u', value: Math.sqrt(meanSquare), unit: '1 rms', goal: [0.5, 1.2], want: 'within', peer: null });
