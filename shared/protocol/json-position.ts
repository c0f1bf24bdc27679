/** Where a text stops being JSON. Line and column count from 1; the message is a sentence with what would be right. */
export interface JsonError {
  line: number;
  column: number;
  message: string;
}

const greatestDepth = 500;

class Refusal extends Error {
  constructor(
    readonly offset: number,
    message: string,
  ) {
    super(message);
  }
}

/**
 * The first place where the text breaks the grammar of JSON (RFC 8259), or null. JavaScript engines tell the place each in their own
 * way or not at all, hence a reader of our own. A name that comes twice in one object is an error too: one of the two would be lost.
 */
export function locateJsonError(text: string): JsonError | null {
  try {
    new Reader(text).document();
    return null;
  } catch (error) {
    if (!(error instanceof Refusal)) throw error;
    const before = text.slice(0, error.offset).split(/\r\n|\r|\n/);
    return { line: before.length, column: (before.at(-1)?.length ?? 0) + 1, message: error.message };
  }
}

class Reader {
  private at = 0;

  constructor(private readonly text: string) {}

  document(): void {
    this.value(0);
    this.space();
    if (this.at < this.text.length) throw new Refusal(this.at, `${this.found()} after the end of the document. Remove it.`);
  }

  private space(): void {
    while (/[ \t\r\n]/.test(this.text[this.at] ?? '')) this.at += 1;
  }

  private found(): string {
    const character = this.text[this.at];
    return character === undefined ? 'The text ends' : `Found ${JSON.stringify(character)}`;
  }

  private value(depth: number): void {
    this.space();
    if (depth > greatestDepth) throw new Refusal(this.at, 'The document is nested too deeply to be read.');
    const character = this.text[this.at];
    if (character === '{') this.object(depth);
    else if (character === '[') this.array(depth);
    else if (character === '"') this.string();
    else this.word();
  }

  private object(depth: number): void {
    const names = new Set<string>();
    this.list('}', 'a name in double quotes', () => {
      const start = this.at;
      const name = this.string();
      if (names.has(name)) throw new Refusal(start, `The name ${JSON.stringify(name)} comes twice in one object. Keep one of the two.`);
      names.add(name);
      this.space();
      if (this.text[this.at] !== ':') throw new Refusal(this.at, `${this.found()} where a colon is expected after the name.`);
      this.at += 1;
      this.value(depth + 1);
    });
  }

  private array(depth: number): void {
    this.list(']', 'a value', () => this.value(depth + 1));
  }

  private list(end: string, expected: string, member: () => void): void {
    this.at += 1;
    this.space();
    if (this.text[this.at] === end) {
      this.at += 1;
      return;
    }
    for (;;) {
      this.space();
      if (this.text[this.at] === end)
        throw new Refusal(this.at, `Found "${end}" after a comma where ${expected} is expected. Remove the comma.`);
      if (end === '}' && this.text[this.at] !== '"') throw new Refusal(this.at, `${this.found()} where ${expected} is expected.`);
      member();
      this.space();
      const character = this.text[this.at];
      if (character !== ',' && character !== end) throw new Refusal(this.at, `${this.found()} where a comma or "${end}" is expected.`);
      this.at += 1;
      if (character === end) return;
    }
  }

  private string(): string {
    const start = this.at;
    const body = /"(?:[^"\\\u0000-\u001f]|\\(?:["\\/bfnrt]|u[0-9a-fA-F]{4}))*"/y;
    body.lastIndex = start;
    const match = body.exec(this.text);
    if (match === null) throw this.badString(start);
    this.at = body.lastIndex;
    return JSON.parse(match[0]) as string;
  }

  private badString(start: number): Refusal {
    for (let index = start + 1; index < this.text.length; index += 1) {
      const character = this.text[index] as string;
      if (character < ' ') return new Refusal(index, 'The text in double quotes is not closed on its line.');
      if (character !== '\\') continue;
      const escape = /^\\(?:["\\/bfnrt]|u[0-9a-fA-F]{4})/.exec(this.text.slice(index, index + 6));
      if (escape === null) return new Refusal(index, 'A backslash is followed by no known letter. Write a backslash itself as two.');
      index += escape[0].length - 1;
    }
    return new Refusal(this.text.length, 'The text ends within double quotes. Close them.');
  }

  private word(): void {
    const token = /(?:true|false|null|-?(?:0|[1-9]\d*)(?:\.\d+)?(?:[eE][+-]?\d+)?)(?![\w.+-])/y;
    token.lastIndex = this.at;
    if (token.exec(this.text) === null)
      throw new Refusal(
        this.at,
        `${this.found()} where a value is expected: an object, a list, a text in double quotes, a number, true, false or null.`,
      );
    this.at = token.lastIndex;
  }
}
