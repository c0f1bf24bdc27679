import { decodeLine, type EventMessage, type Reply } from '@/firmware-protocol/codec';
import { SimulatedMachine } from '@/server/links/simulated-machine';
import { Conversation, START_MS, type Happening } from '@/tests/support/firmware-conversation';
import { hexOf, runFirmware, type Script } from '@/scripts/soak/fuzz/firmware-host';
import { LEVEL } from '@/tests/support/firmware-script';

/**
 * The firmware and the simulated controller, written apart from each other after SPEC.md, say the same to the same
 * conversation. Times are not compared, nor places within a braking distance: they plan their ramps differently.
 */
const SEEDS = Array.from({ length: Number(process.env.EVENFALL_FUZZ_CONVERSATIONS ?? 40) }, (_, index) => 1000 + index);
const EPISODES = 10;
const START_STEPS = -37;
/** Two honest ways to brake end this near to each other. */
const NEAR_STEPS = 3;

interface Heard {
  replies: Reply[];
  events: EventMessage[];
}

function sort(lines: readonly string[]): Heard {
  const heard: Heard = { replies: [], events: [] };
  for (const line of lines) {
    const item = decodeLine(line.trimEnd());
    if (item.kind === 'reply') heard.replies.push(item);
    else if (item.kind === 'event') heard.events.push(item);
    else throw new Error(`neither reply nor event: ${line}`);
  }
  return heard;
}

function bySimulation(happenings: readonly Happening[]): Heard {
  const limits = { least: -3600, greatest: 3600, speed: 200_000, acceleration: 200_000, home: 100_000 };
  const lines: string[] = [];
  const machine = new SimulatedMachine(
    {
      limits,
      startSteps: START_STEPS,
      turnSteps: null,
      backlashSteps: 0,
      homed: false,
      warned: false,
      bootCount: 1,
      uptimeUs: 0,
      version: { major: 1, minor: 0 },
      firmware: 'evenfall-1.0',
    },
    (line) => lines.push(line),
  );
  let rest = '';
  let endUs = 0;
  for (const happening of happenings) {
    const us = happening.ms * 1000;
    endUs = us;
    if ('input' in happening) machine.setInput(happening.input, happening.on, us);
    else if ('reset' in happening) machine.reset(us, happening.reset);
    else {
      const pieces = (rest + happening.bytes).split('\n');
      rest = pieces.pop() as string;
      for (const piece of pieces) machine.receive(piece, us);
    }
  }
  machine.runTo(endUs + 1_000_000);
  return sort(lines);
}

function scriptOf(happenings: readonly Happening[]): Script {
  let levels = Object.values(LEVEL).reduce<number>((sum, bit) => sum + bit, 0);
  const what = (happening: Happening) => {
    if ('reset' in happening) return `start ${happening.reset}`;
    if ('bytes' in happening) return `bytes ${hexOf(happening.bytes)}`;
    levels = happening.on ? levels | LEVEL[happening.input] : levels & ~LEVEL[happening.input];
    return `levels ${levels}`;
  };
  return [
    [0, `table ${START_STEPS} 0`],
    [0, 'start power'],
    ...happenings.map((happening) => [(happening.ms + ('reset' in happening ? START_MS : 0)) * 1000, what(happening)] as const),
    [(happenings.at(-1)?.ms ?? 0) * 1000 + 1_000_000, 'end'],
  ];
}

/** Renewals come at any time, also while one of the two has just arrived and the other has not. */
function renewals(happenings: readonly Happening[]): Set<string> {
  const found = happenings.flatMap((happening) => {
    const item = 'bytes' in happening ? decodeLine(happening.bytes.trimEnd()) : null;
    return item?.kind === 'request' && item.order.word === 'renew' ? [`${item.session} ${item.number}`] : [];
  });
  return new Set(found);
}

/** What must agree: everything but times, the clock's resolution, and where the table is while it moves. */
function essence({ replies, events }: Heard, renewing: Set<string>) {
  const places: (number | null)[] = [];
  const told = replies.map(({ session, number, body }) => {
    if (body.word === 'hi') return { session, number, body: { ...body, resolutionUs: 0 } };
    if (body.word !== 'ok') return { session, number, body };
    if (renewing.has(`${session} ${number}`)) return { session, number, body: 'ok' };
    const still = body.state === 'rest' || body.state === 'waiting';
    if (still) places.push(body.position);
    return { session, number, body: { ...body, position: still ? body.position === null : 'somewhere' } };
  });
  const happened = events.map(({ number, what }) => {
    if (!('position' in what)) return { number, what };
    // A motion that came to its end stands exactly where it should.
    if (what.word === 'ended' && what.cause === 'done') return { number, what };
    places.push(what.position);
    return { number, what: { ...what, position: what.position === null } };
  });
  return { told, happened, places };
}

const conversations = SEEDS.map((seed) => new Conversation(seed, EPISODES).happenings);
let answers: Heard[] = [];
beforeAll(() => {
  answers = runFirmware(conversations.map(scriptOf)).map(({ sent }) => sort(sent.map(({ line }) => line)));
}, 120_000);

test.each(SEEDS.map((seed, index) => [seed, index] as const))('conversation %d', (_seed, index) => {
  const { replies, events } = answers[index] as Heard;
  // The simulation keeps its first event for those who ask.
  const happenings = conversations[index] as Happening[];
  const firmware = essence({ replies, events: events.slice(1) }, renewals(happenings));
  const simulation = essence(bySimulation(happenings), renewals(happenings));
  expect(firmware.told).toEqual(simulation.told);
  expect(firmware.happened).toEqual(simulation.happened);
  firmware.places.forEach((place, at) => {
    const other = simulation.places[at] as number | null;
    expect(Math.abs((place ?? 0) - (other ?? 0))).toBeLessThanOrEqual(NEAR_STEPS);
  });
});
