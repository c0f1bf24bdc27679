import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { root } from './paths.mjs';
import { must } from './run.mjs';
import { expoEnvironment } from './web-build.mjs';

/** Expo's own declaration files (typed routes, NativeWind's class names) are made, not kept. */
export async function ensureTypeFiles() {
  const expo = join(root, 'node_modules', 'expo', 'bin', 'cli');
  await must(process.execPath, [expo, 'customize', 'tsconfig.json'], { cwd: root, env: { ...process.env, ...expoEnvironment } });
  if (!existsSync(join(root, '.expo', 'types', 'router.d.ts')))
    throw new Error('Expo wrote no .expo/types/router.d.ts: typed routes would not be checked.');
}
