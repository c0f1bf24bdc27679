import { demoIds } from '@/db/demo/seed';
import { jobs } from '@/db/schema';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { issued, shortNight, started } from './support/night';

/** Story 5 for people: the door is opened in the night; who is on call sees it on every screen, acknowledges it, and reads who was told. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let protocol: { protocolId: string; revision: number };
beforeAll(async () => {
  protocol = await issued(lab(), shortNight('Disturbed night', 4));
}, 60_000);

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'owner'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('the lab says who is on call, in which order and after how long', async () => {
    await hand.goes('/lab', 'lab-screen');
    await hand.taps('change-on-call');
    if (size === 'phone') {
      await hand.chooses('on-call-add', '5eed0000-0000-4000-8000-000000000002');
      await hand.chooses('on-call-add', '5eed0000-0000-4000-8000-000000000004');
    }
    await hand.types('next-after', '5');
    await hand.shoots('on-call-sheet');
    await hand.taps('on-call-save');
    await hand.at('on-call-sheet').waitFor({ state: 'detached' });
    await hand.reads('on-call', /1\. Whoever started the run.*2\. Casimir Thornquist.*3\. Tam Ferrowdale.*next after 5 min/);
    await hand.taps('try-call');
    await hand.reads('trial', /Push: not set up.*Mail: sent/);
    await hand.types('watcher-url', 'https://10.0.0.7/ping');
    await hand.taps('watcher-save');
    await hand.sees('10.0.0.7 lies in a private network.');
    expect(await hand.at('watcher-url').inputValue()).toBe('https://10.0.0.7/ping');
    await hand.shoots('lab-on-call');
  });

  chapter('the door is opened in a run: every screen says so, in words', async () => {
    await lab().server.arm(20);
    await started(lab(), protocol);
    await lab().pass(60);
    lab().server.world.controller(demoIds.rig).openInterlock();
    await lab().pass(40);
    await hand.goes('/protocols', 'protocols-screen');
    await hand.reads('alarm-bar', /Interlock or door opened.*High alarm, North bench: not acknowledged/);
    expect(await hand.page.getByRole('alert').first().isVisible()).toBe(true);
    await hand.shoots('alarm-bar');
    await hand.follows('/alarms', 'alarms-screen');
    await hand.reads('standing-alarms', /Interlock or door opened.*High, North bench: not acknowledged/);
    await hand.shoots('alarms');
    await hand.follows('/calendar', 'calendar-screen');
    await hand.taps(hand.at('alarm-bar').getByRole('link'));
    await hand.at('alarm-screen').waitFor();
    await hand.sees(/What to do/);
    await hand.reads('hops', /Ilse Marrowby: mail sent/);
    await hand.shoots('alarm');
  });

  chapter('acknowledged, nobody else is rung; what was done is kept; put aside only with a reason', async () => {
    await hand.taps('acknowledge');
    await hand.reads('alarm-state', /acknowledged, still there.*acknowledged by Ottilie Vanterpool/);
    await hand.taps('confirm-done');
    await hand.types('reason-text', 'The cleaner has left, the door is shut.');
    await hand.taps('reason-send');
    await hand.reads('alarm-state', /done by Ottilie Vanterpool: The cleaner has left/);
    await hand.taps('shelve');
    expect(await hand.isEnabled('reason-send')).toBe(false);
    await hand.types('reason-text', 'The door is being painted.');
    await hand.shoots('alarm-shelve');
    await hand.taps('reason-send');
    await hand.reads('alarm-state', /shelved/);
    await hand.taps('unshelve');
    await hand.reads('alarm-state', /not acknowledged/);
    await hand.taps('acknowledge');
    await hand.reads('alarm-state', /acknowledged, still there/);
  });

  chapter('closed again it is over; the run waits for somebody at the rig; the page of alarms keeps what happened', async () => {
    lab().server.world.controller(demoIds.rig).closeInterlock();
    await lab().pass(2);
    const [run] = (await lab().server.as('viewer', 'GET', `/labs/${demoIds.lab}/runs?active=true`).expect(200)).body.items as {
      id: string;
    }[];
    await hand.goes(`/runs/${run?.id ?? ''}`, 'held-notice');
    await hand.reads('held-notice', 'The interlock was opened. Close it and arm the rig again on site, then resume.');
    await hand.reads('resume-why', 'The rig is not armed.');
    expect(await hand.isEnabled('resume')).toBe(false);
    await hand.shoots('held-by-the-door');
    await lab().server.arm(20);
    await hand.goes(`/runs/${run?.id ?? ''}`, 'held-notice');
    await until(() => hand.isEnabled('resume'), 'the run to be one that may go on');
    await lab()
      .server.intervene(run?.id ?? '', 'stop')
      .expect(202);
    await lab().pass(40);
    await hand.goes('/alarms', 'alarms-screen');
    await hand.sees('No alarm stands');
    await hand.shoots('alarms-none');
    await hand.tapsOn('History', 'radio');
    await hand.reads('alarm-history', /Acknowledged: Interlock or door opened, by Ottilie Vanterpool/);
    await hand.shoots('alarms-history');
    await hand.goes(`/runs/${run?.id ?? ''}`, 'result-screen');
    await hand.reads(
      'run-alarms',
      /Interlock or door opened.*The controller ended the motion.*told .*Ilse Marrowby.*seen by Ottilie Vanterpool/,
    );
    await hand.at('run-alarms').scrollIntoViewIfNeeded();
    await hand.shoots('alarms-of-run');
  });

  chapter('work that was given up is shown to owners, who have it tried again', async () => {
    await lab()
      .server.services.database.db.insert(jobs)
      .values({
        ...{ labId: demoIds.lab, kind: 'mail.schedule', payload: {}, state: 'given-up', attempts: 8, maxAttempts: 8 },
        ...{ lastError: '550 5.1.1 no such user here', dueAt: 0, createdAt: Date.now(), finishedAt: Date.now() },
      });
    await hand.follows('/lab', 'lab-screen');
    await hand.reads('given-up-job', /Mail about a scheduled start.*550 5\.1\.1.*8 tries/);
    await hand.at('given-up-job').scrollIntoViewIfNeeded();
    await hand.shoots('given-up-job');
    await hand.taps('retry-job');
    await hand.sees('It is tried again.');
    await hand.at('given-up-job').waitFor({ state: 'detached' });
  });

  chapter('a channel gets a limit, and the review of a start says whom it rings', async () => {
    await hand.follows(`/rigs/${demoIds.rig}`, 'rig-screen');
    await hand.taps('add-limit');
    await hand.types('limit-greatest', '0,002');
    await hand.shoots('limit-sheet');
    await hand.taps('limit-save');
    await hand.at('limit-sheet').waitFor({ state: 'detached' });
    await hand.reads('channel-limits', /deflection: not above 0.002 rad/);
    await hand.taps('add-limit');
    await hand.taps(hand.at('limit-sheet').getByRole('radio', { name: 'Span' }));
    await hand.types('limit-span', '0,5');
    await hand.types('limit-windowMin', '0');
    await hand.reads('limit-sheet', /1 to 1440 min/);
    expect(await hand.isEnabled('limit-save')).toBe(false);
    await hand.shoots('limit-span');
    await hand.types('limit-windowMin', '240');
    await hand.taps('limit-save');
    await hand.at('limit-sheet').waitFor({ state: 'detached' });
    await hand.reads('channel-limits', /deflection: spans at most 0.5 rad in 4 h/);
    await hand.follows(`/rigs/${demoIds.rig}/start?protocol=${protocol.protocolId}&revision=1`, 'start-screen');
    await hand.sees('Ottilie Vanterpool (you), then Casimir Thornquist, then Tam Ferrowdale');
    await hand.shoots('start-on-call');
  });
});
