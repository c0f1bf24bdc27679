import type { Route } from 'playwright-core';
import { demoIds } from '@/db/demo/seed';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { RunView } from '@/shared/contracts/runs';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile, type Lab } from './support/lab';
import { losesAnswerOf } from './support/lost-answer';
import { Network } from './support/network';
import { issued, read, shortNight } from './support/night';

/** Story 4: a run is started, watched, held, resumed and stopped; on a bad network too. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let protocol: { protocolId: string; revision: number };
beforeAll(async () => {
  protocol = await issued(lab(), shortNight('Watched night', 4));
}, 60_000);

const stillWords = /standing still/;
const viewOf = (runId: string): Promise<RunView> => read(lab(), runId);
const eventsOf = async (runId: string, kind: string): Promise<ChainedEvent[]> =>
  ((await read(lab(), `${runId}/events?limit=200`)) as { items: ChainedEvent[] }).items.filter((event) => event.kind === kind);

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  let runId: string;
  let network: Network;
  /** A channel of the room, and the secret of the device that fills it. */
  let air: string;
  let thermometer: string;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    air = `air ${size}`;
    const device = { name: 'thermometer', channels: [{ name: air, role: 'environment', unit: '°C', rateHz: 0.1 }] };
    const made = await lab().server.as('owner', 'POST', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/devices`).send(device).expect(201);
    thermometer = String(made.body.secret);
    network = await Network.to(lab().address);
    hand = new Hand(await lab().open(size, 'operator', { address: network.address }));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
    await network.close();
  });

  chapter('nothing starts on a rig that nobody on site answers for', async () => {
    await hand.goes(`/rigs/${demoIds.rig}/start?protocol=${protocol.protocolId}&revision=1`, 'start-screen');
    await hand.reads('check-armed', 'Nobody on site answers for the rig: arm it there first.');
    expect(await hand.isEnabled('start-run')).toBe(false);
    await hand.sees('A check stands against this start.');
    await hand.shoots('start-not-armed');
  });

  chapter('whoever arms it signs the cautions, turns the key, and leaves through the door', async () => {
    await hand.taps('arm-here');
    await hand.at('arm-sheet').waitFor();
    for (const caution of ['Heavy masses', 'Lead', 'Laser', 'Belt and turntable', 'Mains', 'Emergency stop'])
      await hand.reads('arm-sheet', caution);
    expect(await hand.isEnabled('arm-confirm')).toBe(false);
    await hand.taps('arm-on-site');
    if (size === 'phone') {
      expect(await hand.isEnabled('arm-confirm')).toBe(false);
      await hand.taps(hand.page.getByTestId('arm-sheet').getByTestId('sign-cautions'));
    }
    await hand.reads('cautions-signed', /Signed by Ilse Marrowby for this rig, .*version 1/);
    await hand.shoots('arm');
    await hand.taps('arm-confirm');
    await hand.at('arm-sheet').waitFor({ state: 'detached' });
    await hand.turnsVirtualKey();
    await hand.taps('virtual-door');
    await hand.reads('arming', 'The door is open now.');
    await hand.shoots('arming');
    await lab().pass(121);
    await hand.reads('check-armed', 'The last time: the door was not closed when the exit delay was over');
  });

  chapter('with the door closed when the exit delay is over, the rig is armed', async () => {
    await hand.asksToArm('arm-here');
    await hand.turnsVirtualKey();
    await hand.taps('virtual-door');
    await hand.reads('arming', 'The door is closed now.');
    await hand.reads('arming-left', /^[12]:\d\d$/);
    await lab().pass(121);
    await hand.reads('check-armed', /By Ilse Marrowby until/);
    await until(() => hand.isEnabled('start-run'), 'the start to be allowed');
    await hand.at('start-run').scrollIntoViewIfNeeded();
    await hand.shoots('start');
  });

  chapter('a start without a network is sent once and never by itself; one that comes late starts nothing', async () => {
    const starts = /\/runs$/;
    const sent: string[] = [];
    hand.page.on('request', (request) => void (request.method() === 'POST' && starts.test(request.url()) && sent.push(request.url())));
    await hand.page.route(starts, (route) => route.abort('connectionreset'));
    await hand.keeps('start-run');
    await hand.sees('No answer');
    await hand.sees(/It counts for 5 s and was not sent again/);
    await hand.shoots('start-unanswered');
    await hand.page.unroute(starts);
    // Tapped anew, and under way for longer than a tap counts.
    const late = new Promise<void>((resolve, reject) => {
      const arrive = async (route: Route) => {
        await lab().pass(6);
        // On a busy machine the page may have given it up by then.
        await route.continue().catch(() => undefined);
      };
      void hand.page.route(starts, (route) => arrive(route).then(resolve, reject));
    });
    await hand.keeps('start-run');
    await late;
    await hand.sees(/The tap to start was made \d+ s ago|It counts for 5 s and was not sent again/);
    await hand.page.unroute(starts);
    await until(() => hand.isEnabled('start-run'), 'a start to be allowed again');
    expect((await read(lab(), '?active=true&limit=20')).items).toEqual([]);
    expect(sent).toHaveLength(2);
  });

  chapter('a tap starts nothing; a press that is kept starts the run', async () => {
    await hand.keeps('start-run', 300);
    await hand.sees('Let go too early: nothing was sent.');
    expect((await read(lab(), '?active=true&limit=20')).items).toEqual([]);
    await hand.keeps('start-run');
    await hand.at('run-screen').waitFor();
    runId = new URL(hand.page.url()).pathname.split('/').at(-1) ?? '';
    expect((await read(lab(), '?active=true&limit=20')).items).toMatchObject([{ id: runId }]);
  });

  chapter('the run is seen live: what it does, how long still, deflection, turntable, and how old all this is', async () => {
    await lab().pass(60);
    await hand.reads('run-state', 'Dwell, far side');
    await hand.reads('time-left', /^1[23]:\d\d$/);
    await hand.reads('link-chip', /live \d\.\d s/);
    await hand.reads('deflection-now', /[+−]\d.*rad/);
    await hand.reads('turntable-angle', '−20.18°');
    await hand.hears('live-strip', /4 near dwells and 4 far dwells.*Now: dwell at far.*measured deflection/);
    await hand.shoots('run');
  });

  chapter('the surroundings are beside it: what the lab measures of its room, since when, and when that falls silent', async () => {
    await hand.reads('surroundings', /Nothing in this run yet/);
    const nowMs = lab().server.clock.utcMs();
    const line = (index: number) =>
      JSON.stringify({ channel: air, time_utc: new Date(nowMs - 50_000 + index * 10_000).toISOString(), value: 19.2 + index / 100 });
    const sent = await fetch(`${lab().address}/api/samples`, {
      method: 'POST',
      headers: { authorization: `Bearer ${thermometer}`, 'content-type': 'application/x-ndjson' },
      body: Array.from({ length: 6 }, (_, index) => line(index)).join('\n'),
    });
    expect(await sent.json()).toMatchObject({ stored: 6 });
    await hand.page.reload();
    await hand.reads('surroundings', /19\.250 °C.*19\.200 °C to .*19\.250 °C in this run/);
    await hand.at('surroundings').scrollIntoViewIfNeeded();
    await hand.shoots('surroundings');
    await lab().pass(90);
    await hand.reads('surroundings', /silent, last sample 1 min ago/);
  });

  chapter('a hold says that the server has it before it says that the turntable stands still', async () => {
    await lab().pass(825, () => lab().server.station().link.controller()?.moving === true);
    await hand.reads('run-state', 'Swing to near');
    const flow = lab().freeze();
    await hand.taps('hold');
    await hand.reads('intervention-stages', /Server has it\d\d:\d\d:\d\d\.\d{3}/);
    // No lab time has passed, so the controller cannot have answered, and the page must not claim it did.
    expect(await hand.reads('intervention-stages')).not.toMatch(stillWords);
    expect(await hand.reads('run-state')).not.toMatch(/^Held/);
    await hand.shoots('hold-sent');
    flow();
    await hand.reads('intervention-stages', /Controller: standing still\d\d:\d\d:\d\d\.\d{3}/);
    await hand.reads('run-state', 'Held');
    await hand.reads('held-notice', 'Ilse Marrowby asked to hold.');
    expect((await viewOf(runId)).state).toBe('held');
    await hand.shoots('held');
  });

  chapter('a resume is reviewed, kept pressed, and goes on with the swing', async () => {
    await hand.taps('resume');
    await hand.reads('resume-sheet', 'The source masses will move.');
    // On a busy machine the swing may have ended before the hold reached it.
    await hand.reads('resume-sheet', /Goes on with(Swing to near|Dwell).*First moveSwing to (near \(20\.18°\)|far \(−20\.18°\))/);
    await hand.reads('resume-sheet', /Left7 dwells, 3 pairs/);
    await hand.reads('resume-sheet', /u of G by the plan.*% at the end/);
    await hand.shoots('resume');
    // At the desk the resume arrives and its answer is lost.
    if (size === 'wide') await losesAnswerOf(hand, '*/resume');
    await hand.keeps('resume-confirm');
    await hand.at('resume-sheet').waitFor({ state: 'detached' });
    await lab().pass(15);
    await hand.reads('run-state', /Dwell, near side/);
    expect(await eventsOf(runId, 'resumed')).toHaveLength(1);
    await lab().pass(330);
    await hand.reads('time-left', /^0[78]:\d\d$/);
    await hand.shoots('run-near');
    if (size === 'phone') await hand.pictures('run');
  });

  chapter('a hold after this dwell is withdrawn', async () => {
    await hand.taps('hold-after-dwell');
    await hand.reads('hold-pending', 'Will hold when this dwell has ended.');
    await hand.shoots('hold-pending');
    await hand.taps('withdraw-hold');
    await hand.at('hold-pending').waitFor({ state: 'detached' });
    await hand.at('intervention-stages').waitFor({ state: 'detached' });
    expect((await viewOf(runId)).holdAfterDwell).toBe(false);
  });

  chapter('an end after this pair shows when the run is over, and is taken back', async () => {
    const planned = (await viewOf(runId)).predictedEndAt ?? '';
    await hand.taps('finish-early');
    await hand.reads('finish-pending', /The run ends with the pair under way, as Ilse Marrowby asked.*It is over at about \d\d:\d\d/);
    await hand.shoots('finish-pending');
    expect(Date.parse((await viewOf(runId)).predictedEndAt ?? '')).toBeLessThan(Date.parse(planned) - 600_000);
    await hand.taps('withdraw-finish');
    await hand.at('finish-pending').waitFor({ state: 'detached' });
    expect(Math.abs(Date.parse((await viewOf(runId)).predictedEndAt ?? '') - Date.parse(planned))).toBeLessThan(60_000);
  });

  chapter('hold after this dwell cuts nothing short', async () => {
    await hand.taps('hold-after-dwell');
    await hand.sees('Will hold when this dwell has ended. Nothing is cut short.');
    expect(await hand.reads('run-state')).toMatch(/Dwell, near side/);
    await hand.shoots('hold-after-dwell');
    await passUntil(lab(), async () => (await viewOf(runId)).state === 'held');
    await hand.reads('run-state', 'Held');
    const { items } = await read(lab(), `${runId}/steps`);
    expect(items.at(-1)).toMatchObject({ kind: 'dwell', station: 'near', outcome: 'done', good: true });
    await hand.taps('resume');
    await hand.keeps('resume-confirm');
    await hand.at('resume-sheet').waitFor({ state: 'detached' });
    await hand.reads('run-state', /Swing|Dwell/);
    await hand.at('intervention-stages').waitFor({ state: 'detached' });
  });

  chapter('the rest of a dwell is skipped after a review that says what it leaves out and breaks', async () => {
    await passUntil(lab(), async () => (await viewOf(runId)).current?.kind === 'dwell');
    await lab().pass(60);
    await hand.taps('skip');
    await hand.reads('skip-sheet', /Leaves outDwell, far side: 1[123] min/);
    await hand.reads('skip-sheet', 'This dwell, and the other of its pair when it comes');
    await hand.reads('skip-sheet', /First moveSwing to near/);
    await hand.shoots('skip');
    await hand.keeps('skip-confirm');
    await hand.at('skip-sheet').waitFor({ state: 'detached' });
    await hand.reads('run-state', /Swing to near|Dwell, near side/);
    const { items } = await read(lab(), `${runId}/steps`);
    expect(items.filter(({ outcome }: { outcome: string }) => outcome === 'skipped')).toMatchObject([
      { kind: 'dwell', station: 'far', good: false },
    ]);
    expect(await eventsOf(runId, 'skipped')).toHaveLength(1);
  });

  chapter('on a slow line that breaks between tap and answer a hold is sent again by itself, and acted on once', async () => {
    network.become('slow');
    await hand.taps('hold');
    await hand.reads('intervention-stages', /Sent/);
    network.become('cut');
    await hand.reads('intervention-stages', /^(?!.*standing still).*use the switch at the rig/);
    await hand.shoots('hold-no-network');
    network.become('open');
    await hand.reads('intervention-stages', /Controller: standing still\d\d:\d\d:\d\d\.\d{3}/);
    await hand.reads('run-state', 'Held');
    const holds = (await eventsOf(runId, 'hold-requested')).slice(1);
    expect(holds).toHaveLength(1);
  });

  chapter('without a network stop stays, says so, tries again by itself and acts once', async () => {
    network.become('cut');
    await hand.reads('lost-notice', /Nothing heard from the server/);
    expect(await hand.isEnabled('stop')).toBe(true);
    await hand.shoots('no-network');
    // From here on the server hears the page, but the page hears nothing.
    network.become('deaf');
    await hand.taps('stop');
    await hand.reads('intervention-stages', /^(?!.*standing still).*trying again.*use the switch at the rig/);
    expect(await hand.isEnabled('stop')).toBe(true);
    await until(async () => (await eventsOf(runId, 'stop-requested')).length > 0, 'a stop to reach the server');
    expect(await hand.reads('intervention-stages')).not.toMatch(stillWords);
    await hand.shoots('stop-trying');
    network.become('open');
    await hand.at('result-screen').waitFor();
    await hand.reads('headline', /Stopped at \d\d:\d\d/);
    expect(await eventsOf(runId, 'stop-requested')).toHaveLength(1);
    await hand.reads('good-dwells', /^2 of 8/);
    await hand.shoots('stopped');
  });

  chapter('after a stop the rig is no longer armed', async () => {
    await hand.follows(`/rigs/${demoIds.rig}`, 'rig-screen');
    await hand.reads('disarmed', /Not armed since .*\(Ilse Marrowby\): the run was stopped\./);
    expect((await viewOf(runId)).state).toBe('stopped');
  });
});

/** Lets lab time pass in short strides until something is so. */
async function passUntil(place: Lab, holds: () => Promise<boolean>): Promise<void> {
  for (let strides = 0; strides < 60 && !(await holds()); strides += 1) await place.pass(20);
}
