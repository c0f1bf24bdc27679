import { demoIds, demoPassword } from '@/db/demo/seed';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { ControllerProcess } from '@/scripts/soak/board/controller-process';
import { sizes, type Size } from '../support/browser';
import { Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { issued, read, shortNight, started } from './support/night';

/** What goes wrong is said on the screen: what, where and what would be right; nothing typed is lost. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const base = `/labs/${demoIds.lab}`;

async function madeProtocol(document: ProtocolDocument): Promise<string> {
  const made = await lab().server.as('operator', 'POST', `${base}/protocols`).send({ document }).expect(201);
  return String(made.body.id);
}

const storedDocument = async (protocolId: string): Promise<ProtocolDocument> =>
  (await lab().server.as('viewer', 'GET', `${base}/protocols/${protocolId}`).expect(200)).body.document;

/** Somebody else saves the draft. */
async function savedByKeeper(protocolId: string, change: (document: ProtocolDocument) => ProtocolDocument): Promise<void> {
  const { body, headers } = await lab().server.as('keeper', 'GET', `${base}/protocols/${protocolId}`).expect(200);
  const request = lab().server.as('keeper', 'PUT', `${base}/protocols/${protocolId}`).set('If-Match', String(headers.etag));
  await request.send({ document: change(body.document) }).expect(200);
}

/** Lets lab time pass in strides of a second, so that what waits for an answer gives up sooner. */
async function passUntil(holds: () => Promise<boolean>): Promise<void> {
  await until(
    async () => {
      await lab().pass(1);
      return holds();
    },
    'the line to be given up',
    90_000,
  );
}

let babble: ControllerProcess;
beforeAll(async () => {
  babble = new ControllerProcess(['--babble']);
  await babble.start();
  const document = { ...demoRigWide, motion: { ...demoRigWide.motion, keepOut: [[-5, 5]] } };
  await lab()
    .server.as('keeper', 'POST', `${base}/rigs`)
    .send({ name: 'South bench', document, link: { kind: 'simulated' } })
    .expect(201);
}, 60_000);
afterAll(() => babble.dispose());

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'operator'));
  });
  beforeEach(() => lab().enter(hand.browser, 'operator'));
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  test('a session that ends in mid-edit is renewed over the page, and the edit is saved', async () => {
    const protocolId = await madeProtocol(shortNight(`Interrupted, ${size}`, 3));
    await hand.goes(`/protocols/${protocolId}`, 'editor');
    // The session ends between the edit and its saving.
    await hand.page.route(
      /\/protocols\//,
      async (route) => {
        if (route.request().method() === 'PUT') await lab().endSessions('operator');
        await route.continue();
      },
      { times: 1 },
    );
    await hand.taps('step-3');
    await hand.taps('duplicate');
    await hand.at('sign-in-again').waitFor();
    await hand.sees('What you were doing is kept under this sheet.');
    await hand.types('sign-in-password', 'not the password');
    await hand.taps('sign-in');
    await hand.sees('This e-mail and password do not belong together. Check both, or ask for a new password.');
    await hand.shoots('sign-in-again');
    await hand.types('sign-in-password', demoPassword);
    await hand.taps('sign-in');
    await hand.at('sign-in-again').waitFor({ state: 'detached' });
    await hand.at('step-4').waitFor();
    await until(async () => (await storedDocument(protocolId)).steps.length === 4, 'the edit to be saved');
  });

  test('two editors of one protocol: who saved and what differs is shown, and whose is kept is asked', async () => {
    const protocolId = await madeProtocol(shortNight(`Shared, ${size}`, 3));
    await hand.goes(`/protocols/${protocolId}`, 'editor');
    await savedByKeeper(protocolId, (document) => ({ ...document, notes: 'written by the other' }));
    await hand.taps('step-2');
    await hand.taps('duplicate');
    await hand.reads('conflict-sheet', /Casimir Thornquist saved this draft at .*, after you opened it/);
    await hand.reads('conflict-sheet', /written by the other/);
    await hand.shoots('conflict');
    await hand.taps('take-theirs');
    await hand.at('conflict-sheet').waitFor({ state: 'detached' });
    await hand.at('step-4').waitFor({ state: 'detached' });
    await hand.taps('undo');
    await hand.at('step-4').waitFor();
    await until(async () => (await storedDocument(protocolId)).steps.length === 4, 'mine to be saved after undo');

    await savedByKeeper(protocolId, (document) => ({ ...document, notes: 'written again' }));
    await hand.taps('step-2');
    await hand.taps('delete');
    await hand.taps('keep-mine');
    await until(async () => (await storedDocument(protocolId)).steps.length === 3, 'mine to be saved over theirs');
    expect((await storedDocument(protocolId)).notes ?? '').not.toContain('written again');
  });

  test('a protocol that names an unknown station or passes a keep-out arc cannot be issued, and the step says why', async () => {
    const protocolId = await madeProtocol({
      ...shortNight(`Not to be issued, ${size}`, 1),
      steps: [{ kind: 'home' }, { kind: 'swing', to: 'nowhere' }, { kind: 'dwell', for_s: 60 }],
    });
    await hand.goes(`/protocols/${protocolId}`, 'editor');
    await hand.sees(/nowhere.*near/);
    await hand.taps('issue');
    await hand.reads('issue-sheet', /1 thing stands against it on North bench/);
    await hand.shoots('unknown-station');
    expect(await hand.isEnabled('issue-confirm')).toBe(false);
    await hand.taps('sheet-close');

    await hand.goes(`/protocols/${await madeProtocol(shortNight(`Through the arc, ${size}`, 1))}`, 'editor');
    if (size === 'phone') {
      await hand.taps('open-more');
      await hand.taps('open-protocol-details');
    }
    await hand.chooses('planning-rig', 'South bench');
    if (size === 'phone') await hand.taps('sheet-close');
    await hand.sees(/keep-out/i);
    await hand.taps('issue');
    await hand.reads('issue-sheet', /stand.* against it on South bench/);
    await hand.shoots('keep-out');
    expect(await hand.isEnabled('issue-confirm')).toBe(false);
    await hand.taps('sheet-close');
    await hand.page.evaluate(() => localStorage.clear());
  });

  test('broken JSON is refused with line and column, and the text stays', async () => {
    await hand.goes('/protocols/new', 'new-protocol-screen');
    await hand.taps('from-file');
    const broken = '{\n  "formatVersion": 1,\n  "name": "Broken",\n  "steps": [ { "kind": "home" } }\n}';
    await hand.types('import-text', broken);
    await hand.taps('import-read');
    await hand.reads('import-sheet', /This is no protocol yet.*line 4/i);
    expect(await hand.at('import-text').inputValue()).toBe(broken);
    await hand.shoots('broken-json');
    await hand.types('import-text', '{"formatVersion": 1, "name": "Wrong", "steps": [{"kind": "swing"}, {"kind": "pirouette"}]}');
    await hand.taps('import-read');
    await hand.reads('import-sheet', /things are wrong.*1\.swing.*pirouette/);
    expect(await hand.at('import-text').inputValue()).toContain('pirouette');
    await hand.taps('sheet-close');
  });

  test('a rig that is busy takes no second start', async () => {
    await lab().server.arm(20);
    const protocol = await issued(lab(), shortNight(`First come, ${size}`, 1));
    await hand.goes(`/rigs/${demoIds.rig}/start?protocol=${protocol.protocolId}`, 'start-screen');
    await until(() => hand.isEnabled('start-run'), 'the start to be allowed');
    // This page does not hear that somebody else was quicker.
    const told = await (await hand.page.waitForResponse(/start-checks/)).body();
    await hand.page.route(/start-checks/, (route) => route.fulfill({ status: 200, contentType: 'application/json', body: told }));
    await hand.page.route(/runs\?active/, (route) =>
      route.fulfill({ status: 200, contentType: 'application/json', body: '{"items":[],"next":null}' }),
    );
    const runId = await started(lab(), protocol);
    await hand.keeps('start-run');
    await hand.sees('The run was not started');
    await hand.sees(/First come.*started by Ilse Marrowby, is (starting|running)\. Wait for its end, or stop it\./);
    await hand.shoots('second-start');
    await hand.page.unrouteAll();
    expect((await read(lab(), '?active=true&limit=20')).items.map(({ id }: { id: string }) => id)).toEqual([runId]);
    await hand.goes(`/rigs/${demoIds.rig}`, 'rig-screen');
    await hand.at('running-now').waitFor();
    await hand.taps('start-a-run');
    await hand.sees(/One run at a time: wait until it ends, or stop it\./);
    await lab().server.as('viewer', 'POST', `${base}/runs/${runId}/stop`).send({}).expect(202);
    await until(async () => (await read(lab(), runId)).state === 'stopped', 'the first run to be stopped');
  });

  test('a viewer reads that others start and edit, and may hold and stop all the same', async () => {
    await lab().server.arm(20);
    const runId = await started(lab(), await issued(lab(), shortNight(`Seen by all, ${size}`, 1)));
    await lab().enter(hand.browser, 'viewer');
    await hand.goes(`/rigs/${demoIds.rig}`, 'rig-screen');
    await hand.sees('Only an operator, a keeper or an owner may start a run. You are a viewer.');
    expect(await hand.page.getByTestId('start-a-run').count()).toBe(0);
    await hand.shoots('viewer-rig');
    await hand.goes(`/protocols/${demoIds.shortProtocol}`, 'editor');
    await hand.sees(/Only an operator, a keeper or an owner may write and issue protocols\. You are a viewer\./);
    expect(await hand.page.getByTestId('issue').count()).toBe(0);
    await hand.shoots('viewer-editor');
    await hand.goes(`/runs/${runId}`, 'run-screen');
    await hand.taps('hold');
    await hand.reads('run-state', 'Held');
    await hand.reads('resume-why', 'Only an operator, a keeper or an owner may resume a run.');
    expect(await hand.isEnabled('resume')).toBe(false);
    await hand.shoots('viewer-held');
    await hand.taps('stop');
    await hand.at('result-screen').waitFor();
    expect((await read(lab(), runId)).reason).toContain('Pim Oldershaw');
  });

  test('a port that does not exist and one that talks garbage are told apart, before and after they are used', async () => {
    await lab().enter(hand.browser, 'keeper');
    await hand.goes(`/rigs/${demoIds.rig}/link`, 'link-screen');
    await hand.tapsOn('Serial line', 'radio');
    await hand.types('link-path', '/dev/pts/90210');
    await hand.taps('try-link');
    await hand.reads('try-result', 'There is no port /dev/pts/90210. Plug the controller in, or choose the path under which it appears.');
    await hand.shoots('no-port');
    await hand.types('link-path', babble.path);
    await hand.taps('try-link');
    await passUntil(() => hand.at('try-result').filter({ hasText: 'Something talks' }).isVisible());
    await hand.reads('try-result', /Something talks at .*, but not the controller's language.*Check the port, the rate and the firmware\./);
    await hand.shoots('garbage-port');
    await hand.taps('save-link');
    await hand.at('rig-screen').waitFor();
    await passUntil(() =>
      hand.page
        .getByText(/but not the controller's language/)
        .first()
        .isVisible(),
    );
    await hand.shoots('garbage-rig');
    await hand.goes(`/rigs/${demoIds.rig}/link`, 'link-screen');
    expect(await hand.at('link-path').inputValue()).toBe(babble.path);
    await hand.tapsOn('Simulated', 'radio');
    await hand.taps('save-link');
    await hand.reads('rig-link-state', 'live');
  });
});
