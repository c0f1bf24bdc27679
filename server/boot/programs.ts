import { spawn } from 'node:child_process';
import { existsSync, readdirSync } from 'node:fs';
import { join } from 'node:path';

/** Programs of Debian's packages that a command runs. */

const debianFolder = '/usr/lib/postgresql';

/** PostgreSQL's program of this name, of the newest version that is installed. */
export function postgresProgram(name: 'pg_dump' | 'pg_restore'): string {
  const versions = existsSync(debianFolder) ? readdirSync(debianFolder).map(Number).filter(Number.isFinite) : [];
  const found = versions
    .sort((one, other) => other - one)
    .map((version) => join(debianFolder, String(version), 'bin', name))
    .find((path) => existsSync(path));
  return found ?? name;
}

/** A database address as libpq's environment: a password on the command line could be read by everybody. */
export function postgresEnvironment(databaseUrl: string): Record<string, string> {
  const url = new URL(databaseUrl);
  return {
    PGHOST: url.hostname,
    PGPORT: url.port === '' ? '5432' : url.port,
    PGUSER: decodeURIComponent(url.username),
    PGPASSWORD: decodeURIComponent(url.password),
    PGDATABASE: decodeURIComponent(url.pathname.slice(1)),
  };
}

/** Runs a program to its end. @throws Error with its last words where it does not end with 0 */
export function runProgram(program: string, args: readonly string[], env: Record<string, string>): Promise<void> {
  return new Promise((resolve, reject) => {
    const child = spawn(program, args, { stdio: ['ignore', 'ignore', 'pipe'], env: { ...process.env, ...env } });
    let words = '';
    child.stderr.on('data', (chunk: Buffer) => (words = `${words}${chunk.toString()}`.slice(-2000)));
    child.on('error', reject);
    child.on('close', (code) => (code === 0 ? resolve() : reject(new Error(`${program} ended with ${String(code)}: ${words.trim()}`))));
  });
}
