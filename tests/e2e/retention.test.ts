import { demoIds } from '@/db/demo/seed';
import { askForThinning } from '@/server/http/work/thinning-job';
import type { KeptChannel } from '@/shared/contracts/retention';
import { sizes, type Size } from '../support/browser';
import { Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';

/** Years of samples: somebody decides how long a channel is kept, is told what would go, and sees what is left. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const dayMs = 86_400_000;

/** A channel of the demo rig with half an hour of twenty days ago at two samples a second. */
async function oldChannel(name: string): Promise<void> {
  const { server } = lab();
  const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
  const channels = [{ name, role: 'environment', unit: 'degC', rateHz: 2 }];
  await server.as('owner', 'POST', `${rig}/devices`).send({ name, channels }).expect(201);
  const { body } = await server.as('owner', 'GET', `${rig}/channels`).expect(200);
  const { id } = (body.items as { id: string; name: string }[]).find((channel) => channel.name === name) ?? { id: '' };
  const fromMs = Math.floor((server.clock.utcMs() - 20 * dayMs) / 2000) * 2000;
  const utcMs = Float64Array.from({ length: 3600 }, (_, index) => fromMs + index * 500);
  await server.services.samples.append(demoIds.lab, id, { utcMs, value: utcMs.map((_, index) => 20 + Math.sin(index / 50)) });
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  beforeAll(async () => {
    await oldChannel(`box air ${size}`);
    hand = new Hand(await lab().open(size, 'keeper'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  test('what a number of days would take away is said before it is decided, and what went is told', async () => {
    const name = `box air ${size}`;
    const row = () => hand.page.getByTestId('kept-row').filter({ hasText: name });
    await hand.goes('/lab', 'lab-screen');
    await hand.taps('to-retention');
    await hand.at('retention-screen').waitFor();
    await row().getByText('as the lab: for ever').waitFor();
    await hand.taps(row().getByRole('button'));
    await hand.tapsOn('Some days', 'radio');
    await hand.at('retention-days').fill('3');
    await hand.sees('whole days, 7 to 36500');
    expect(await hand.at('decide-retention').isDisabled()).toBe(true);
    await hand.at('retention-days').fill('10');
    await hand.reads('dry-run', /^3600 samples would go, from (\S+) to \1\.$/);
    await hand.shoots('retention-sheet');
    await hand.tapsOn('Thin them, a day from now');
    await row()
      .getByText(/^10 days; nothing goes before /)
      .waitFor();

    const { server } = lab();
    await server.database.connection.pool.query("update retention_rules set decided_at = decided_at - interval '1 day'");
    await askForThinning(server.services);
    const wasThinned = async () => {
      await lab().pass(1);
      const { body } = await server.as('viewer', 'GET', `/labs/${demoIds.lab}/retention`).expect(200);
      return (body.channels as KeptChannel[]).find(({ channel }) => channel.name === name)?.thinned?.samples === 3600;
    };
    await until(wasThinned, 'the samples to be thinned');
    await hand.page.reload();
    await row()
      .getByText(/^Full rate from .* on and within runs; before, summaries of 2\ss\. 3600 samples went\.$/)
      .waitFor();
    await hand.shootsThemes('retention', () => hand.goes('/lab/retention', 'kept-channels'));
  });
});
