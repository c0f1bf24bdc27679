import { act, fireEvent, render, screen } from '@testing-library/react';
import { ControlBar } from '@/components/runs/control-bar';
import { useIntervention } from '@/components/runs/use-intervention';
import type { RunView } from '@/shared/contracts/runs';
import { nowUtcMs, timeZone, viewAt } from '../fixtures/run';

/** The stop button on a network that fails: what is said at each stage, and what is sent when. */

interface Sent {
  atMs: number;
  key: string | null;
  keepalive: boolean | undefined;
}

let sent: Sent[] = [];
let answer: () => Promise<Response>;
const begin = Date.UTC(2031, 2, 14, 1, 14, 0);

const reply = (status: number, body: unknown) =>
  ({ ok: status < 300, status, headers: new Headers(), json: () => Promise.resolve(body) }) as Response;
const accepted = () => reply(202, { runId: 'run-1', serverAt: new Date(Date.now()).toISOString() });
const problem = (status: number, code: string, detail: string) =>
  reply(status, { type: `/problems/${code}`, title: 'x', status, code, detail });
const noNetwork = () => Promise.reject(new TypeError('network'));

function Bar({ view }: { view: RunView }) {
  const { local, tap } = useIntervention({ labId: 'lab-1', runId: 'run-1' });
  return <ControlBar view={view} local={local} onTap={tap} timeZone={timeZone} />;
}

beforeEach(() => {
  jest.useFakeTimers({ now: begin });
  sent = [];
  answer = noNetwork;
  globalThis.fetch = jest.fn((_: RequestInfo | URL, init?: RequestInit) => {
    sent.push({ atMs: Date.now() - begin, key: new Headers(init?.headers).get('idempotency-key'), keepalive: init?.keepalive });
    return answer();
  }) as typeof fetch;
});
afterEach(() => jest.useRealTimers());

const after = (ms: number) => act(() => jest.advanceTimersByTimeAsync(ms));
const stages = () => screen.getByTestId('intervention-stages').textContent ?? '';
const stop = () => screen.getByTestId('stop');

async function tapStop(view = viewAt(nowUtcMs)) {
  const page = render(<Bar view={view} />);
  fireEvent.click(stop());
  await after(0);
  return page;
}

test('sends at 0, 0.3, 0.8, 1.8, 3.8 … s with one key, alive beyond the page, and gives up after 30 s', async () => {
  await tapStop();
  await after(31_000);
  expect(sent.map(({ atMs }) => atMs)).toEqual([0, 300, 800, 1800, 3800, 7800, 15_800, 29_000]);
  expect(new Set(sent.map(({ key }) => key)).size).toBe(1);
  expect(sent.every(({ keepalive }) => keepalive === true)).toBe(true);
  expect(stages()).toContain('No answer in 30 s');
  expect(stages()).toContain('use the switch at the rig');
  await after(60_000);
  expect(sent).toHaveLength(8);
});

test('stays enabled without a network, and a tap after giving up is a new act with a new key', async () => {
  await tapStop();
  expect(stop().getAttribute('aria-disabled')).not.toBe('true');
  await after(31_000);
  fireEvent.click(stop());
  await after(0);
  expect(sent.at(-1)?.key).not.toBe(sent[0]?.key);
});

test('a page that sleeps between tap and answer sends nothing later than 30 s after the tap, and says that there was no answer', async () => {
  await tapStop();
  // Whoever sleeps sees time leap, and all timers come due at once.
  jest.setSystemTime(begin + 40_000);
  await after(1000);
  await after(1000);
  expect(sent.map(({ atMs }) => atMs)).toEqual([0]);
  expect(stages()).toContain('No answer in 30 s');
  fireEvent.click(stop());
  await after(0);
  expect(sent).toHaveLength(2);
  expect(sent[1]?.key).not.toBe(sent[0]?.key);
});

test('a second tap while sending tries at once with the same key', async () => {
  await tapStop();
  await after(1000);
  const before = sent.length;
  fireEvent.click(stop());
  await after(0);
  expect(sent.length).toBe(before + 1);
  expect(sent.at(-1)?.key).toBe(sent[0]?.key);
});

test('says which stage is reached and never "stopped" before the controller confirmed', async () => {
  const { rerender } = await tapStop();
  expect(stages()).toMatch(/Stop sent/);
  expect(stages()).not.toMatch(/stopped/i);
  answer = () => Promise.resolve(accepted());
  await after(2000);
  await after(1000);
  expect(stages()).toMatch(/the server has it, waiting for the controller/);
  expect(stages()).not.toMatch(/stopped/i);
  const count = sent.length;
  await after(30_000);
  expect(sent).toHaveLength(count);

  const serverAt = new Date(begin + 1800).toISOString();
  const known = { kind: 'stop' as const, by: 'Ragna Quill', serverAt, confirmedAt: null };
  rerender(<Bar view={viewAt(nowUtcMs, { state: 'stopping', intervention: known })} />);
  await after(1000);
  expect(stages()).not.toMatch(/stopped/i);
  rerender(
    <Bar view={viewAt(nowUtcMs, { state: 'stopped', intervention: { ...known, confirmedAt: new Date(begin + 2231).toISOString() } })} />,
  );
  await after(1000);
  expect(stages()).toMatch(/Stopped: the controller confirmed at 02:14:02\.231/);
});

test('a server that is still at work on the first attempt, or without its database, is asked again', async () => {
  const answers = [problem(409, 'still-running', 'at work'), problem(503, 'database-away', 'away'), accepted()];
  answer = () => Promise.resolve(answers.shift() ?? accepted());
  await tapStop();
  await after(900);
  expect(sent).toHaveLength(3);
  await after(1000);
  expect(stages()).toMatch(/Stop: the server has it/);
});

test('a refusal is final and gives the reason', async () => {
  answer = () => Promise.resolve(problem(409, 'not-possible-now', 'The run has already ended.'));
  await tapStop();
  await after(5000);
  expect(sent).toHaveLength(1);
  expect(screen.getByRole('alert').textContent).toContain('The run has already ended.');
});

test('an attempt that hangs does not keep the next one waiting', async () => {
  answer = () => new Promise<Response>(() => undefined);
  await tapStop();
  await after(1000);
  answer = () => Promise.resolve(accepted());
  await after(1000);
  await after(1000);
  expect(stages()).toMatch(/Stop: the server has it/);
});

test('hold cannot take the place of a stop that is being sent', async () => {
  await tapStop();
  const before = sent.length;
  fireEvent.click(screen.getByTestId('hold'));
  await after(0);
  expect(sent.length).toBe(before);
});

test('says that it is no emergency stop and where that one is', () => {
  render(<Bar view={viewAt(nowUtcMs)} />);
  expect(screen.getByText(/The hard-wired one is at the rig/)).toBeTruthy();
});
