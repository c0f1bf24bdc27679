/** Passwords that the server must give to others, as they lie in the database: readable only with a key that is not in it. */
export interface SecretBox {
  /** `of`: what it belongs to; nothing else can open it. */
  seal(text: string, of: string): string;
  /** Null where it was sealed with another key, or belongs to something else. */
  open(sealed: string, of: string): string | null;
}

const prefix = 'sealed:1:';

/** Whether a text was sealed by a box. */
export const isSealed = (text: string): boolean => text.startsWith(prefix);

export const sealedPrefix = prefix;
