/** Size of the ATmega328P's program memory, bytes (data sheet DS40002061, section 8.2). */
const FLASH_BYTES = 32_768;
const DATA = 0;
const END = 1;
const EXTENDED = [2, 4];
const START = [3, 5];

/**
 * The program memory out of an Intel HEX file (record types 0 to 5); what the file leaves out is erased (0xFF).
 * @throws Error naming the line whose checksum, length, type or address is wrong, or a missing end record
 */
export function programOf(hex: string): Uint8Array {
  const program = new Uint8Array(FLASH_BYTES).fill(0xff);
  let base = 0;
  let ended = false;
  hex.split(/\r?\n/).forEach((line, index) => {
    if (line === '') return;
    const wrong = (what: string) => new Error(`line ${index + 1} of the firmware image: ${what}`);
    if (ended) throw wrong('comes after the end record');
    const bytes = recordBytes(line);
    if (bytes === null) throw wrong('is no record of Intel HEX');
    if (bytes.length !== (bytes[0] as number) + 5) throw wrong(`says ${bytes[0]} bytes and has ${bytes.length - 5}`);
    if (bytes.reduce((sum, byte) => sum + byte, 0) % 256 !== 0) throw wrong('its checksum is wrong');
    const [, high = 0, low = 0, type = 0] = bytes;
    const data = bytes.slice(4, -1);
    const value = data.reduce((sum, byte) => sum * 256 + byte, 0);
    if (type === DATA) {
      const from = base + high * 256 + low;
      if (from + data.length > FLASH_BYTES) throw wrong(`goes beyond ${FLASH_BYTES} bytes of program memory`);
      program.set(data, from);
    } else if (type === END) ended = true;
    else if (EXTENDED.includes(type)) base = value * (type === 2 ? 16 : 65_536);
    else if (!START.includes(type)) throw wrong(`has the unknown type ${type}`);
  });
  if (!ended) throw new Error('the firmware image has no end record: it was cut off');
  return program;
}

function recordBytes(line: string): number[] | null {
  if (!/^:([0-9A-Fa-f]{2}){5,}$/.test(line)) return null;
  return (line.slice(1).match(/../g) ?? []).map((pair) => Number.parseInt(pair, 16));
}
