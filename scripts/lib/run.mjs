import { spawn } from 'node:child_process';

/**
 * Runs a program to its end.
 * @returns {Promise<{code: number | null, stdout: string, stderr: string}>}
 */
export function run(command, args, options = {}) {
  const { input, ...rest } = options;
  return new Promise((resolve, reject) => {
    const child = spawn(command, args, { stdio: ['pipe', 'pipe', 'pipe'], ...rest });
    let stdout = '';
    let stderr = '';
    child.stdout?.on('data', (chunk) => (stdout += chunk));
    child.stderr?.on('data', (chunk) => (stderr += chunk));
    child.on('error', reject);
    child.on('close', (code) => resolve({ code, stdout, stderr }));
    child.stdin?.on('error', () => undefined);
    child.stdin?.end(input ?? '');
  });
}

/** Like `run`, but a code other than 0 is an error that shows what the program said. */
export async function must(command, args, options) {
  const result = await run(command, args, options);
  if (result.code !== 0)
    throw new Error(`${command} ${args.join(' ')} ended with ${result.code}:\n${(result.stderr || result.stdout).trim().slice(-3000)}`);
  return result.stdout;
}

/** Runs a program with the terminal as its own; resolves with its exit code. */
export function pass(command, args, options = {}) {
  return new Promise((resolve, reject) => {
    const child = spawn(command, args, { stdio: 'inherit', ...options });
    child.on('error', reject);
    child.on('close', (code, signal) => resolve(signal === null ? (code ?? 1) : 1));
  });
}
