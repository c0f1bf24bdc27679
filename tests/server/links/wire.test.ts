import { decodeLine, encode, type Request } from '@/firmware-protocol/codec';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { Wire, type LiveRequest } from '@/server/links/wire';
import { MachinePeer } from './machine-peer';

test('request numbers go round at 65536, and the controller carries out every request of the way (SPEC 3.6)', () => {
  const peer = new MachinePeer().greet(5);
  const wire = new Wire(new VirtualClock(0, async () => undefined), 5, () => undefined);
  const refused: string[] = [];
  const numbers = new Set<number>();
  wire.attach({
    write: (bytes) => {
      const asked = decodeLine(bytes.slice(0, -1));
      if (asked.kind === 'request') numbers.add((asked as Request).number);
      for (const line of peer.put(bytes)) {
        const reply = decodeLine(line);
        if (reply.kind !== 'reply') continue;
        if (reply.body.word === 'no') refused.push(encode(reply));
        const request = wire.requestOf(reply);
        if (request !== null) wire.input(request, { kind: 'ok' }, reply);
      }
    },
    close: () => undefined,
  });
  wire.openSession(peer.session);
  peer.number = 0;
  for (let turn = 0; turn < 70_000; turn += 1) {
    const request: LiveRequest = {
      of: 'ask',
      life: { phase: 'queued' },
      sent: null,
      compose: () => ({ word: 'status' }),
      told: () => undefined,
    };
    wire.send(request);
    // The first number is the renewal's of the peer itself.
    if (turn > 0 && request.life.phase !== 'over') throw new Error(`request ${turn} was not answered`);
  }
  expect(numbers.size).toBe(65_536);
  expect(refused.length).toBeLessThanOrEqual(1);
});
