import { demoIds } from '@/db/demo/seed';
import { TestBroker } from '../support/mqtt-broker';
import { chapters, Hand } from './support/hand';
import { labOfThisFile } from './support/lab';

/** Story 6: a sensor that speaks MQTT fills a channel; the page tells what came, what was refused, and when the broker is gone. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let broker: TestBroker;
let hand: Hand;
const chapter = chapters(() => hand);

beforeAll(async () => {
  broker = await TestBroker.start();
  hand = new Hand(await lab().open('phone', 'owner'));
}, 60_000);
afterAll(async () => {
  expect(hand.browser.errors).toEqual([]);
  await lab().close(hand.browser);
  await broker.stop();
});

chapter('an owner adds a broker with a topic', async () => {
  await hand.goes(`/rigs/${demoIds.rig}`, 'brokers');
  await hand.taps('add-broker');
  expect(await hand.isEnabled('make-broker')).toBe(false);
  await hand.types('broker-address', broker.address);
  await hand.types('broker-filter', 'lab/#/air');
  await hand.types('broker-channel', 'cellar air');
  await hand.taps('make-broker');
  await hand.sees(/# alone as the last level/);
  await hand.sees('The broker was not added');
  // What was said of the topic goes with it.
  await hand.types('broker-filter', 'lab/+/ai');
  await hand.page.getByText('The broker was not added').waitFor({ state: 'detached' });
  await hand.types('broker-filter', 'lab/+/air');
  await hand.shoots('broker-sheet');
  await hand.taps('make-broker');
  await hand.at('broker-sheet').waitFor({ state: 'detached' });
  await hand.reads('broker-topic', /lab\/\+\/air fills cellar air, degC.*No message from this topic yet/);
});

chapter('what comes and what is refused is seen', async () => {
  await lab().pass(40);
  for (let turns = 0; turns < 50 && broker.connections === 0; turns += 1) await lab().pass(10);
  await lab().pass(10);
  await broker.say('lab/cellar/air', '12.5', { qos: 1 });
  await broker.say('lab/cellar/air', '12,5', { qos: 1 });
  await lab().pass(40);
  await hand.goes(`/rigs/${demoIds.rig}`, 'brokers');
  await hand.reads('broker-state', /^connected/);
  await hand.reads(
    'broker-topic',
    /1 taken, 1 refused.*Last message, lab\/cellar\/air.*12,5.*a finite number with a decimal point is needed/,
  );
  await hand.at('brokers').scrollIntoViewIfNeeded();
  await hand.shoots('brokers');
  const desk = new Hand(await lab().open('wide', 'owner'));
  await desk.goes(`/rigs/${demoIds.rig}`, 'brokers');
  await desk.at('brokers').scrollIntoViewIfNeeded();
  await desk.shoots('brokers');
  await desk.taps('add-broker');
  await desk.at('broker-sheet').waitFor();
  await desk.shoots('broker-sheet');
  await lab().close(desk.browser);
});

chapter('the mapping is changed, and another topic comes to it', async () => {
  await hand.taps('change-broker');
  expect(await hand.at('broker-filter').inputValue()).toBe('lab/+/air');
  await hand.types('broker-filter', 'lab/attic/air');
  await hand.taps('add-topic');
  const second = hand.page.getByTestId('broker-topic-form').nth(1);
  expect(await hand.isEnabled('make-broker')).toBe(false);
  await second.getByTestId('broker-filter').fill('lab/attic/tilt');
  await second.getByTestId('broker-channel').fill('attic tilt');
  await second.getByTestId('broker-unit').fill('urad');
  await hand.shoots('broker-change');
  await hand.taps('make-broker');
  await hand.at('broker-sheet').waitFor({ state: 'detached' });
  await hand.sees(/lab\/attic\/air fills cellar air, degC/);
  await hand.sees(/lab\/attic\/tilt fills attic tilt, urad/);
});

chapter('a removed broker is gone', async () => {
  await hand.taps('remove-broker');
  await hand.taps('remove-broker-sure');
  await hand.at('broker').waitFor({ state: 'detached' });
});
