import { demoIds } from '@/db/demo/seed';
import { sizes, type Size } from '../support/browser';
import { findings, themes } from './support/axe';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { Network } from './support/network';

/** "My hands are in the rig" on a network that is cut between tap and answer, and with a server whose database is away. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
const locks = () => lab().server.services.locks.locksOf(demoIds.rig);

/** An owner lifts what stands, as somebody does who was called. */
async function liftAll(): Promise<void> {
  for (const { id } of locks())
    await lab().server.as('owner', 'POST', `${rig}/locks/${id}/override`).send({ reason: 'seen to' }).expect(204);
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  let network: Network;
  const chapter = chapters(() => hand);
  const inEveryTheme = async () => {
    for (const theme of themes) expect(await findings(hand, theme)).toEqual([]);
  };

  beforeAll(async () => {
    network = await Network.to(lab().address);
    hand = new Hand(await lab().open(size, 'keeper', { address: network.address }));
  }, 60_000);
  afterAll(async () => {
    await lab().close(hand.browser);
    await network.close();
  });

  chapter('the network is cut: the page says plainly that nothing is locked, and what to use', async () => {
    await hand.goes(`/rigs/${demoIds.rig}`, 'rig-screen');
    network.become('cut');
    await hand.taps('set-lock');
    await hand.reads('lock-stages', 'Server has it');
    await hand.reads('lock-sentence', /^Not locked: no answer yet, trying again \(\d\)\. Use the switch or the key at the rig\.$/);
    expect(await hand.at('locked-notice').count()).toBe(0);
    expect(locks()).toEqual([]);
    await inEveryTheme();
    await hand.shoots('lock-no-network');
  });

  chapter('it comes back within the 30 s: the lock arrives by itself, once', async () => {
    network.become('open');
    await hand.reads('locked-notice', 'Casimir Thornquist has hands in the rig. Nothing moves.');
    await hand.reads('lock-stages', /Server has it\d/);
    expect(await hand.at('lock-sentence').textContent()).toBe('');
    expect(locks()).toHaveLength(1);
    await inEveryTheme();
    await hand.shoots('lock-set');
    await liftAll();
    await hand.at('set-lock').waitFor();
  });

  chapter('what is sent arrives and no answer comes back: the same lock is told when one does', async () => {
    network.become('deaf');
    await hand.taps('set-lock');
    await until(() => locks().length === 1, 'the lock to reach the server');
    const [first] = locks();
    expect(await hand.at('locked-notice').count()).toBe(0);
    network.become('open');
    await hand.reads('locked-notice', 'Casimir Thornquist has hands in the rig.');
    expect(locks()).toEqual([first]);
    await liftAll();
    await hand.at('set-lock').waitFor();
  });

  chapter('while the database is away the lock is set, and the page says so although it cannot read the rig', async () => {
    await lab().passWithoutDatabase(5, async () => {
      await hand.taps('set-lock');
      await hand.reads('locked-notice', 'Casimir Thornquist has hands in the rig. Nothing moves.');
      expect(lab().server.services.locks.lockedBy(demoIds.rig)).toContain('Casimir Thornquist');
      await hand.shoots('lock-without-database');
    });
    await until(async () => {
      const view = await lab().server.as('viewer', 'GET', rig);
      return view.status === 200 && (view.body as { locks: unknown[] }).locks.length === 1;
    }, 'the rig to be read with its lock');
    await hand.reads('locked-notice', 'Casimir Thornquist has hands in the rig.');
    await liftAll();
    await hand.at('set-lock').waitFor();
  });
});
