/** A payload of NOTIFY is shorter than 8000 bytes (PostgreSQL documentation, NOTIFY): longer messages travel in pieces. */

const pieceChars = 7_500;
/** Pieces of so many unfinished messages are kept. */
const mostUnfinished = 200;

const ascii = (text: string) => text.replaceAll(/[\u0080-\uffff]/g, (char) => `\\u${char.charCodeAt(0).toString(16).padStart(4, '0')}`);

/** A message as payloads: sender, number, place, count, piece of JSON in ASCII. */
export function toPieces(from: string, number: number, message: unknown): string[] {
  const text = ascii(JSON.stringify(message));
  const count = Math.max(1, Math.ceil(text.length / pieceChars));
  return Array.from(
    { length: count },
    (_, place) => `${from} ${String(number)} ${String(place)} ${String(count)} ${text.slice(place * pieceChars, (place + 1) * pieceChars)}`,
  );
}

/** Puts messages together again; what is no piece of ours is left alone. */
export class Pieces {
  private readonly unfinished = new Map<string, (string | undefined)[]>();

  /** @param own name of this process, whose own messages are not told @returns the message that is whole now, or null */
  add(payload: string, own: string): unknown {
    const [, from = '', number = '', place = '', count = '', piece = ''] = /^(\S+) (\d+) (\d+) (\d+) (.*)$/s.exec(payload) ?? [];
    if (from === '' || from === own) return null;
    if (count === '1') return parsed(piece);
    const key = `${from} ${number}`;
    const pieces = this.unfinished.get(key) ?? [];
    pieces[Number(place)] = piece;
    this.unfinished.set(key, pieces);
    if (Object.keys(pieces).length < Number(count)) {
      const oldest = this.unfinished.size > mostUnfinished ? this.unfinished.keys().next().value : undefined;
      if (oldest !== undefined) this.unfinished.delete(oldest);
      return null;
    }
    this.unfinished.delete(key);
    return parsed(pieces.join(''));
  }

  clear(): void {
    this.unfinished.clear();
  }
}

function parsed(text: string): unknown {
  try {
    return JSON.parse(text);
  } catch {
    return null;
  }
}
