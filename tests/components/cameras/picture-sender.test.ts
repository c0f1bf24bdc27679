import { ApiProblem } from '@/components/api/problem';
import { PictureSender } from '@/components/cameras/picture-sender';
import type { CameraEvents } from '@/components/spot/camera';

function bench() {
  const state = { nowMs: 10_000, opens: 0, closed: 0, awake: false, refuse: null as Error | null, away: null as Error | null };
  const sent: { token: string; ageS: number }[] = [];
  let events: CameraEvents | null = null;
  const sender = new PictureSender({
    camera: {
      list: async () => [],
      open: async (id, told) => {
        if (state.away !== null) throw state.away;
        state.opens += 1;
        events = told;
        return { id: id ?? 'first', name: 'Built in', holdSettings: async () => [], close: () => void (state.closed += 1) };
      },
    },
    device: {
      now: () => ({ awake: state.awake, battery: { level: 0.2, charging: false }, hidden: false }),
      keepAwake: () => void (state.awake = true),
      letSleep: () => void (state.awake = false),
    },
    shot: async () => new Blob(['picture'], { type: 'image/jpeg' }),
    send: async (token, _, ageS) => {
      if (state.refuse !== null) throw state.refuse;
      sent.push({ token, ageS });
    },
    nowMs: () => state.nowMs,
  });
  const frame = () =>
    events?.frame({
      capturedMs: state.nowMs - 40,
      stamped: 'capture',
      missed: 0,
      width: 1,
      height: 1,
      pixels: () => new Uint8ClampedArray(4),
    });
  const pass = async (ms: number, live = true) => {
    for (const endMs = state.nowMs + ms; state.nowMs < endMs;) {
      state.nowMs += 250;
      if (live) frame();
      await sender.step('token');
    }
  };
  return { sender, state, sent, pass, ended: () => events?.ended() };
}
const problem = (code: 'wrong-token' | 'too-many-requests', detail: string) =>
  new ApiProblem({ type: `/problems/${code}`, title: code, status: 401, code, detail } as ConstructorParameters<typeof ApiProblem>[0]);

test('a picture goes every 3 s with the age that it had, and the device stays awake for it', async () => {
  const { sender, state, sent, pass } = bench();
  await sender.openCamera(null);
  await pass(5_000);
  expect(sent).toEqual([]);
  sender.begin();
  await pass(10_000);
  expect(sent).toEqual(Array.from({ length: 4 }, () => ({ token: 'token', ageS: 0.04 })));
  expect([state.awake, sender.view().sent, sender.view().trouble]).toEqual([true, 4, null]);
  sender.end();
  await pass(10_000);
  expect([state.awake, sent.length]).toEqual([false, 4]);
});

test('where the network is away it is tried again in growing pauses, and goes on by itself', async () => {
  const { sender, state, sent, pass } = bench();
  await sender.openCamera(null);
  sender.begin();
  state.refuse = new Error('The server does not answer.');
  await pass(60_000);
  expect([sent.length, sender.view().trouble]).toEqual([0, 'The server does not answer.']);
  state.refuse = null;
  await pass(31_000);
  expect(sent.length).toBeGreaterThan(0);
  expect(sender.view().trouble).toBeNull();
});

test('a token that counts no more ends it, and says so', async () => {
  const { sender, state, pass } = bench();
  await sender.openCamera(null);
  sender.begin();
  state.refuse = problem('wrong-token', 'No camera has this token, or it was removed.');
  await pass(1_000);
  expect(sender.view()).toMatchObject({ sending: false, trouble: 'No camera has this token, or it was removed.' });
  expect(state.awake).toBe(false);
});

test('a camera that was unplugged sends nothing old and is taken up again when it is back', async () => {
  const { sender, state, sent, pass, ended } = bench();
  await sender.openCamera('left');
  sender.begin();
  await pass(4_000);
  const before = sent.length;
  state.away = new Error('No camera is connected to this device.');
  ended();
  await pass(20_000, false);
  expect([sent.length, sender.view().camera.kind]).toEqual([before, 'lost']);
  state.away = null;
  await pass(8_000);
  expect(sender.view().camera).toEqual({ kind: 'open', id: 'left', name: 'Built in' });
  expect(sent.length).toBeGreaterThan(before);
});

test('a picture that stands still is not sent as a new one', async () => {
  const { sender, sent, pass } = bench();
  await sender.openCamera(null);
  sender.begin();
  await pass(4_000);
  await pass(12_000, false);
  expect(sender.view().trouble).toBe('The camera gives no new pictures.');
  expect(sent.every(({ ageS }) => ageS <= 5)).toBe(true);
});

test('a camera that opens after it was given up is closed at once', async () => {
  const { sender, state } = bench();
  const opening = sender.openCamera(null);
  sender.closeCamera();
  await opening;
  expect([state.opens, state.closed, sender.view().camera.kind]).toEqual([1, 1, 'closed']);
});

test('what may end it is told while it sends: a battery that will not last', async () => {
  const { sender, pass } = bench();
  await sender.openCamera(null);
  expect(sender.view().warnings).toEqual([]);
  sender.begin();
  await pass(500);
  expect(sender.view().warnings).toEqual([
    expect.stringMatching(/^On battery, 20.% left: it will not last the night\. Plug the device in\.$/),
  ]);
});

test('a page that was loaded anew looks for its camera and goes on', async () => {
  const { sender, state, sent, pass } = bench();
  state.away = new Error('no camera');
  sender.resume();
  await pass(4_000, false);
  expect([sender.view().camera.kind, sender.view().sending, sent]).toEqual(['lost', true, []]);
  state.away = null;
  await pass(8_000);
  expect(sender.view().camera.kind).toBe('open');
  expect(sent.length).toBeGreaterThan(0);
});
