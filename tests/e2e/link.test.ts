import { demoIds } from '@/db/demo/seed';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';
import { chapters, Hand, numberOf, plain, until } from './support/hand';
import { labOfThisFile } from './support/lab';

/**
 * A keeper's first move of a new drive, at the rig with a phone: the line is seen live, the direction found, steps per degree
 * measured, the travel taught, the limits written to the controller. Then a colleague looks at it from a desk.
 */

jest.setTimeout(90_000);
const lab = labOfThisFile();
let hand: Hand;
let rigId: string;
const tell = chapters(() => hand);

/** Quick, so that nobody waits; the drive makes 2 % fewer degrees of a microstep than its document says. */
const motion: RigMotion = {
  ...(demoRigWide.motion as RigMotion),
  ...{ stepsPerDegree: 40, homeSpeed_deg_s: 6, maxAcceleration_deg_s2: 40, minDeg: -90, maxDeg: 90 },
};

const turntable = () => lab().server.world.controller(rigId);
const trueDeg = () => turntable().trueAngleDegAt(lab().server.clock.utcMs());

beforeAll(async () => {
  const made = await lab()
    .server.as('keeper', 'POST', `/labs/${demoIds.lab}/rigs`)
    .send({ name: 'New bench', document: { ...demoRigWide, motion }, link: { kind: 'simulated' } })
    .expect(201);
  rigId = made.body.id as string;
  hand = new Hand(await lab().open('phone', 'keeper'));
}, 60_000);

/** Nudges and waits until the table stands still again. */
async function nudges(steps: number): Promise<void> {
  const before = trueDeg();
  await hand.types('nudge-steps', String(Math.abs(steps)));
  await until(() => hand.isEnabled(steps > 0 ? 'nudge-ccw' : 'nudge-cw'), 'the nudge to be allowed');
  await hand.taps(steps > 0 ? 'nudge-ccw' : 'nudge-cw');
  await hand.reads('order-state', new RegExp(`Nudge of ${String(steps)} microsteps: done`));
  await until(() => Math.abs(trueDeg() - before - steps / 40) < 0.03, 'the table to have turned');
}

tell('the line and the inputs are seen live', async () => {
  await hand.goes(`/rigs/${rigId}/link`, 'link-screen');
  await hand.reads('line-health', /live.*Last answer.*(just now|1 s ago).*Round trip.*ms.*Set aside here0.*Clock offset.*s ± .*Firmware/);
  await hand.reads('line-inputs', /Arm key on: somebody is at the rig/);
  turntable().turnArmKey(false);
  await hand.reads('line-inputs', /Arm key off/);
  await hand.shoots('link');
});

tell('nothing begins before the rig is armed and its key is on', async () => {
  await hand.taps('first-move');
  await hand.at('first-move-screen').waitFor();
  await hand.reads('conditions', /armed it: not yet.*key on the controller is on: not yet/);
  await hand.taps('first-move-read');
  expect(await hand.isEnabled('begin-guided')).toBe(false);
  await hand.shoots('first-move-before');
  await hand.asksToArm();
  await hand.reads('arming', 'Turn the arm key on');
  turntable().turnArmKey(true);
  await hand.reads('arming', 'Leave the room and close the door');
  await lab().pass(121);
  await until(() => hand.isEnabled('begin-guided'), 'the first move to be allowed');
  await hand.taps('begin-guided');
  await hand.at('nudge-pad').waitFor();
});

tell('the direction is found with a few microsteps', async () => {
  await nudges(8);
  await hand.shoots('first-move-direction');
  await hand.taps('turned-ccw');
  await hand.reads('direction-answer', 'the table turns the way it is asked');
  await hand.taps('to-steps');
});

tell('a marked turn gives steps per degree with their uncertainty, and a revision', async () => {
  await hand.taps('mark-here');
  await nudges(180);
  await nudges(12);
  expect(numberOf(plain((await hand.at('turned-steps').textContent()) ?? '').split(' ')[0])).toBe(192);
  await hand.types('turned-deg', '4.704');
  await hand.types('turned-u', '0.02');
  await hand.taps('take-turn');
  // 192 / 4.704 = 40.816, u = 40.816 · 0.02 / 4.704
  await hand.reads('steps-per-degree', /40\.82\(17\)/);
  await hand.reads('steps-comparison', /The rig document says 40.*They differ: 2\.0 % ± 0\.43 %/);
  await hand.at('steps-per-degree').scrollIntoViewIfNeeded();
  await hand.shoots('first-move-steps');
  await hand.types('revise-steps-reason', 'Engraved scale, read twice.');
  await hand.taps('revise-steps');
  await hand.at('this-is-least').waitFor();
});

tell('a hold ends a nudge at once and says when the controller confirmed it', async () => {
  await hand.reads('line-chip', 'live');
  await hand.types('nudge-steps', '180');
  await until(() => hand.isEnabled('nudge-ccw'), 'the nudge to be allowed');
  await hand.taps('nudge-ccw');
  await hand.taps('hold');
  await hand.reads('intervention-stages', /Controller: standing still/);
  await hand.shoots('first-move-held');
});

tell('the travel is taught at its two ends', async () => {
  await hand.taps('this-is-greatest');
  for (let turn = 0; turn < 3; turn += 1) {
    await hand.types('nudge-steps', '180');
    await until(() => hand.isEnabled('nudge-cw'), 'the nudge to be allowed');
    const before = trueDeg();
    await hand.taps('nudge-cw');
    await until(() => before - trueDeg() > 4.3 && !(lab().server.station(rigId).link.controller()?.moving ?? true), 'the nudge to be done');
  }
  await until(() => hand.isEnabled('this-is-least'), 'the table to stand still');
  await hand.taps('this-is-least');
  await hand.types('margin-deg', '0.5');
  await hand.reads('taught-limits', /−.*° to .*°/);
  await hand.at('travel').scrollIntoViewIfNeeded();
  await hand.shoots('first-move-travel');
  await hand.taps('revise-travel');
  await hand.at('teach').waitFor();
});

tell('the limits are written to the controller, which then reports the same', async () => {
  await hand.reads('limits-state', 'other limits than the rig document');
  await until(() => hand.isEnabled('teach'), 'the writing to be allowed');
  await hand.shoots('first-move-limits-before');
  await hand.taps('teach');
  await hand.reads('limits-state', 'has the limits of the rig document');
  await hand.shoots('first-move-limits');
});

tell('whoever leaves the page leaves nothing moving and the rig free', async () => {
  await hand.tapsOn('3 Travel', 'radio');
  await hand.goes(`/rigs/${rigId}`, 'rig-screen');
  await until(() => lab().server.services.guided.of(rigId) === null, 'the rig to be free');
  await hand.sees('revision 3');
  expect(hand.browser.errors).toEqual([]);
});

tell('from a desk an operator sees the line, and what must hold before a first move', async () => {
  await lab().close(hand.browser);
  hand = new Hand(await lab().open('wide', 'operator'));
  await hand.goes(`/rigs/${rigId}/link`, 'link-screen');
  await hand.reads('line-health', /live/);
  await hand.sees('Only a keeper or an owner may change a rig.');
  await hand.shoots('link');
  await hand.taps('first-move');
  await hand.at('first-move-screen').waitFor();
  await hand.taps('first-move-read');
  // Each signs for himself.
  expect(await hand.isEnabled('begin-guided')).toBe(false);
  await hand.taps('sign-cautions');
  await until(() => hand.isEnabled('begin-guided'), 'the first move to be allowed');
  await hand.taps('begin-guided');
  await until(() => hand.isEnabled('nudge-ccw'), 'the nudge to be allowed');
  // the table stands at its least end, in the arc that is kept out of runs, and turns out of it
  await hand.types('nudge-steps', '14');
  await hand.taps('into-keep-out');
  await hand.taps('nudge-ccw');
  await hand.reads('order-state', /done/);
  await hand.shoots('first-move-direction');
  await hand.taps('end-guided');
  await hand.at('begin-guided').waitFor();
  expect(hand.browser.errors).toEqual([]);
});
