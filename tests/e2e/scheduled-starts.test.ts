import { demoIds } from '@/db/demo/seed';
import { heedSchedules } from '@/server/http/work/scheduled-starts';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';

/** Story 3, its starts: one that is due is made in the name of whoever planned it, or missed and explained. */

jest.setTimeout(120_000);
const lab = labOfThisFile();

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'keeper'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('a start that is due on a rig that is not armed is missed and says why; on an armed one the run is there', async () => {
    const starts = async (armed: boolean): Promise<void> => {
      const dueUtcMs = Math.ceil(lab().server.clock.utcMs() / 60_000) * 60_000 + 120_000;
      const [date = '', time = ''] = new Intl.DateTimeFormat('sv-SE', { timeZone: 'Europe/Zurich', dateStyle: 'short', timeStyle: 'short' })
        .format(dueUtcMs)
        .split(' ');
      const asked = { rigId: demoIds.rig, protocolId: demoIds.shortProtocol, revision: 1, massSetId: demoIds.massSet };
      await lab()
        .server.as('operator', 'POST', `/labs/${demoIds.lab}/schedules`)
        .send({ ...asked, plan: { kind: 'once', date, time } })
        .expect(201);
      if (armed) await lab().server.arm(20);
      await lab().pass((dueUtcMs - lab().server.clock.utcMs()) / 1000 + 5);
      await heedSchedules(lab().server.services);
      await lab().pass(5);
    };
    await starts(false);
    await hand.goes('/calendar', 'calendar-screen');
    await hand.tapsOn('List', 'radio');
    // The other size has missed one before.
    const missed = hand.page.getByTestId('start-row').filter({ hasText: 'Missed' });
    await until(async () => (await missed.count()) === (size === 'phone' ? 1 : 2), 'the start to be shown as missed');
    await hand.shoots('calendar-missed');
    await starts(true);
    await hand.goes('/runs', 'runs-screen');
    await hand.shoots('started-by-schedule');
    const { items } = (await lab().server.as('viewer', 'GET', `/labs/${demoIds.lab}/runs?active=true&limit=5`).expect(200)).body;
    expect(items).toMatchObject([{ rigId: demoIds.rig, state: 'running' }]);
    await hand.goes(`/runs/${String(items[0].id)}`, 'run-screen');
    await hand.taps('stop');
    await hand.at('result-screen').waitFor();
  });
});
