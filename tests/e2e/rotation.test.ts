import { demoIds } from '@/db/demo/seed';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand } from './support/hand';
import { labOfThisFile } from './support/lab';
import { started } from './support/night';

/** A rig that is free to turn: a rotation is composed, run, held in mid-turn, and says how far out the sources stand. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const turning: ProtocolDocument = {
  formatVersion: 1,
  name: 'Turning',
  steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, { kind: 'rotate', period_s: 900, turns: 2 }, { kind: 'dwell', for_s: 60 }],
};
let runId: string;
beforeAll(async () => {
  const { server } = lab();
  const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
  const { headers } = await server.as('keeper', 'GET', rig).expect(200);
  const document = { ...demoRigWide, motion: { ...demoRigWide.motion, turnsLimit: 3 } };
  await server
    .as('keeper', 'PUT', `${rig}/document`)
    .set('If-Match', headers.etag as string)
    .send({ name: 'North bench', document, reason: 'Slip ring' })
    .expect(200);
  await lab().pass(5);
  const lesson = server
    .station()
    .link.teach({ leastDeg: -1255, greatestDeg: 1255, maxSpeedDegS: 6, maxAccelerationDegS2: 2, homeSpeedDegS: 0.6 });
  await lab().pass(2);
  expect(await lesson).toMatchObject({ taught: true });
  await server.arm(20);
  runId = await started(lab(), { protocolId: await server.issue(turning), revision: 1 });
  await lab().pass(1200);
}, 60_000);

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'operator'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('a rotation is added with the turns that the cables stand, and refused beyond them', async () => {
    await hand.goes('/protocols/new', 'new-protocol-screen');
    await hand.taps('template-still');
    await hand.at('editor').waitFor();
    await hand.taps('add-step');
    await hand.taps('add-rotate');
    await hand.sees('Rotate 3 turns');
    const row = hand.page.getByRole('treeitem', { name: /Rotate 3 turns/ });
    if ((await row.getAttribute('aria-selected')) !== 'true') await row.click();
    await row.click();
    await hand.at('step-details').waitFor();
    await hand.sees('The cables of this rig stand 3 either way.');
    await hand.sees(/By plan out 1 h 30 min, back 3 min 3 s/);
    await hand.shoots('rotate-form');
    await hand.types('rotate-turns', '-4');
    if (size === 'phone') await hand.taps('sheet-close');
    await hand.sees(/Accepted are up to 3 either way/);
    await hand.shoots('rotate-refused');
  });

  chapter('the run says that it turns; held it says how far out the sources stand, and what a resume does', async () => {
    await hand.goes(`/runs/${runId}`, 'run-screen');
    if (size === 'phone') {
      await hand.reads('run-state', /^Rotate$/);
      await hand.shoots('rotate-run');
      await lab().server.intervene(runId, 'hold').expect(202);
      await lab().pass(5);
    }
    await hand.sees(/1\.3\d turns from where the rotation began\. Resumed, it goes on and turns back at its end\./);
    await hand.shoots('rotate-held');
  });
});
