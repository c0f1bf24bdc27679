import { hash, verify, type Algorithm } from '@node-rs/argon2';
import { commonStems } from './common-passwords';

/** argon2id with 19 MiB, two passes, one lane: the first choice of OWASP's Password Storage Cheat Sheet. */
const options = { algorithm: 2 satisfies Algorithm.Argon2id, memoryCost: 19_456, timeCost: 2, parallelism: 1 } as const;

/** The encoded argon2id hash of a password, with its parameters and a fresh salt. */
export const hashPassword = (password: string): Promise<string> => hash(password.normalize('NFKC'), options);

/**
 * Whether `password` is the one that was hashed. Without a hash (nobody has this address) the same work is done against
 * a hash of nothing, so that the time tells nothing.
 */
export async function verifyPassword(passwordHash: string | null, password: string): Promise<boolean> {
  const matches = await verify(passwordHash ?? hashOfNobody, password.normalize('NFKC'));
  return passwordHash !== null && matches;
}

/** Of a random value that was thrown away; same parameters as `options`. */
const hashOfNobody = '$argon2id$v=19$m=19456,t=2,p=1$JCXeGWdBuD2iGUa/yJjUBw$ImGT019TbCeq+5GGBZJVMj2NMzhNaySNDymR8pKNoPo';

const lookalikes: Record<string, string> = { '0': 'o', '1': 'i', '3': 'e', '4': 'a', '5': 's', '7': 't', '@': 'a', $: 's', '!': 'i' };

/** Lower case, without what people put before and after a word to please a rule. */
const trimmed = (text: string) => text.replace(/^[^a-z]+|[^a-z]+$/g, '');
const letters = (text: string) => text.replace(/[013457@$!]/g, (sign) => lookalikes[sign] ?? sign).replace(/[^a-z]/g, '');

/**
 * Why a new password is refused, in words for the person who chose it, or null. Length is the contract's matter.
 * @param about words that others know of this person: name, address
 */
export function weaknessOf(password: string, about: readonly string[]): string | null {
  const lower = password.normalize('NFKC').toLowerCase();
  const stems = [lower, trimmed(lower), letters(trimmed(lower)), letters(lower)];
  if (stems.some((stem) => commonStems.has(stem) || commonStems.has(onceOf(stem))))
    return 'this is one of the passwords tried first; choose a few words that do not belong together';
  if (new Set(lower).size < 5) return 'it is made of fewer than five different characters; choose a few words that do not belong together';
  if (isSequence(lower)) return 'it follows the alphabet, the digits or the keyboard; choose a few words that do not belong together';
  const known = about.flatMap((text) => text.toLowerCase().split(/[^\p{L}\p{N}]+/u)).filter((word) => word.length >= 4);
  const rest = known.reduce((text, word) => text.replaceAll(word, ''), lower).replace(/[^\p{L}]/gu, '');
  if (rest.length < 4 && known.some((word) => lower.includes(word)))
    return 'it is little more than your name or address; choose a few words that do not belong together';
  return null;
}

/** `abcabcabc` → `abc`. */
function onceOf(text: string): string {
  const period = (text + text).indexOf(text, 1);
  return period > 0 && period < text.length && text.length % period === 0 ? text.slice(0, period) : text;
}

const rows = [
  'abcdefghijklmnopqrstuvwxyz',
  '01234567890123456789',
  'qwertyuiopasdfghjklzxcvbnm',
  'qwertzuiopasdfghjklyxcvbnm',
  'azertyuiopqsdfghjklmwxcvbn',
];

/** Whether the text is made of at most three runs along a row, forward or backward. */
function isSequence(text: string): boolean {
  let runs = 0;
  for (let at = 0; at < text.length; runs += 1) at += Math.max(1, longestRun(text.slice(at)));
  return runs <= 3;
}

function longestRun(text: string): number {
  let best = 0;
  for (const row of rows.flatMap((forward) => [forward, [...forward].reverse().join('')])) {
    let length = 0;
    while (length < text.length && row.includes(text.slice(0, length + 1))) length += 1;
    best = Math.max(best, length);
  }
  return best;
}
