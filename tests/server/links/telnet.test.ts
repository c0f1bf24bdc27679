import * as fc from 'fast-check';
import { ComPortAgreement, escaped, TelnetReader, type TelnetCommand } from '@/server/links/telnet';

/** Byte values as RFC 854 (IAC 255, DONT 254, DO 253, WONT 252, WILL 251, SB 250, SE 240) and RFC 2217 (COM-PORT-OPTION 44) give them. */
const bytes = (...values: number[]) => Buffer.from(values);
const will44 = [255, 251, 44];
const do44: TelnetCommand = { kind: 'option', verb: 'do', option: 44 };

describe('bytes', () => {
  test('of 255 are doubled on the way out and halved on the way in, however the stream is cut', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 40 }), fc.array(fc.nat(10), { minLength: 1, maxLength: 10 }), (sent, cuts) => {
        const wire = escaped(Buffer.from(sent));
        const reader = new TelnetReader();
        const got: number[] = [];
        for (let from = 0, turn = 0; from < wire.length; turn += 1) {
          const to = from + 1 + (cuts[turn % cuts.length] as number);
          got.push(...reader.take(wire.subarray(from, to)).data);
          from = to;
        }
        expect(got).toEqual([...sent]);
      }),
      { seed: 20_260_301, numRuns: 300 },
    );
  });

  test('commands are taken out from between them', () => {
    const reader = new TelnetReader();
    const stream = [0x61, 255, 253, 44, 0x62, 255, 250, 44, 101, 0, 1, 194, 0, 255, 240, 0x63, 255, 241, 0x64];
    const taken = stream.map((byte) => reader.take(bytes(byte)));
    expect(Buffer.concat(taken.map(({ data }) => data)).toString()).toBe('abcd');
    expect(taken.flatMap(({ commands }) => commands)).toEqual([do44, { kind: 'answer', to: 1, value: 115_200 }]);
  });

  test('a 255 inside an answer is halved, and an endless one is bounded', () => {
    const reader = new TelnetReader();
    expect(reader.take(bytes(255, 250, 44, 101, 0, 0, 255, 255, 0, 255, 240)).commands).toEqual([{ kind: 'answer', to: 1, value: 0xff00 }]);
    reader.take(bytes(255, 250, ...Array.from({ length: 5_000 }, () => 1), 255, 240));
    expect(reader.take(bytes(0x61)).data.toString()).toBe('a');
  });
});

describe('the agreement on the port', () => {
  const settle = (agreement: ComPortAgreement, rate = 115_200) => {
    for (const [to, value] of [
      [1, rate],
      [2, 8],
      [3, 1],
      [4, 1],
    ] as const)
      agreement.hear({ kind: 'answer', to, value });
  };

  test('offers the option, asks for the rate and 8N1 when it is accepted, and is complete when all is acknowledged', () => {
    const agreement = new ComPortAgreement({ baudRate: 115_200 });
    expect([...agreement.opening().subarray(0, 3)]).toEqual(will44);
    const asked = agreement.hear(do44);
    expect([...asked]).toEqual([
      ...[255, 250, 44, 1, 0, 1, 194, 0, 255, 240],
      ...[255, 250, 44, 2, 8, 255, 240],
      ...[255, 250, 44, 3, 1, 255, 240],
      ...[255, 250, 44, 4, 1, 255, 240],
    ]);
    expect(agreement.isComplete).toBe(false);
    settle(agreement);
    expect(agreement.isComplete).toBe(true);
    expect(agreement.hear(do44)).toHaveLength(0);
  });

  test('sets DTR and RTS where they are chosen, and waits for no answer about them', () => {
    const agreement = new ComPortAgreement({ baudRate: 9_600, dtr: false, rts: true });
    expect(agreement.hear(do44).toString('hex')).toContain(
      bytes(255, 250, 44, 5, 9, 255, 240, 255, 250, 44, 5, 11, 255, 240).toString('hex'),
    );
    settle(agreement, 9_600);
    expect(agreement.isComplete).toBe(true);
  });

  test('says so when the server does not know the option or sets another rate', () => {
    const agreement = new ComPortAgreement({ baudRate: 115_200 });
    expect(() => agreement.hear({ kind: 'option', verb: 'dont', option: 44 })).toThrow('does not know RFC 2217');
    agreement.hear(do44);
    expect(() => agreement.hear({ kind: 'answer', to: 1, value: 9_600 })).toThrow('sets 9600 Bd instead of 115200');
    expect(() => agreement.hear({ kind: 'answer', to: 4, value: 2 })).toThrow('8 data bits, no parity and 1 stop bit');
  });

  test('declines what else is offered or asked for', () => {
    const agreement = new ComPortAgreement({ baudRate: 115_200 });
    expect([...agreement.hear({ kind: 'option', verb: 'will', option: 1 })]).toEqual([255, 254, 1]);
    expect([...agreement.hear({ kind: 'option', verb: 'do', option: 24 })]).toEqual([255, 252, 24]);
    for (const verb of ['wont', 'dont'] as const) expect(agreement.hear({ kind: 'option', verb, option: 1 })).toHaveLength(0);
    expect(agreement.hear({ kind: 'option', verb: 'do', option: 0 })).toHaveLength(0);
  });
});
