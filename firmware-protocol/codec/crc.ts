/**
 * CRC-16/CCITT-FALSE (SPEC 1.4): polynomial 0x1021, initial value 0xFFFF, not reflected, no final exclusive-or.
 * Check value 0x29B1 for "123456789".
 */

const POLYNOMIAL = 0x1021;

const table = Uint16Array.from({ length: 256 }, (_, byte) => {
  let remainder = byte << 8;
  for (let bit = 0; bit < 8; bit += 1)
    remainder = remainder & 0x8000 ? ((remainder << 1) ^ POLYNOMIAL) & 0xffff : (remainder << 1) & 0xffff;
  return remainder;
});

/** CRC of the first `length` characters of `text`, each taken as one byte. */
export function crc16(text: string, length: number = text.length): number {
  let crc = 0xffff;
  for (let index = 0; index < length; index += 1) {
    crc = ((crc << 8) & 0xffff) ^ (table[(crc >> 8) ^ (text.charCodeAt(index) & 0xff)] as number);
  }
  return crc;
}

/** Four hexadecimal digits in upper case. */
export function hex4(value: number): string {
  return (0x10000 + value).toString(16).slice(1).toUpperCase();
}

/** An identifier of SPEC 2.1: eight hexadecimal digits in upper case. */
export function hex8(value: number): string {
  return (value >>> 0).toString(16).toUpperCase().padStart(8, '0');
}
