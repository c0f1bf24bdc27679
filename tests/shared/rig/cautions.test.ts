import { createHash } from 'node:crypto';
import { cautionsText, cautionsVersion } from '@/shared/rig/cautions';

/** SHA-256 of the words of each version that was ever signed: other words need a number of their own, so that old signatures stay true. */
const signed: Record<number, string> = {
  1: '3e7a13d0043b6fed98d1eae7355682b333f502c48b8522b5bba8238d45c4fc87',
};

test('the words that are signed belong to their version', () => {
  expect(createHash('sha256').update(cautionsText()).digest('hex')).toBe(signed[cautionsVersion]);
});
