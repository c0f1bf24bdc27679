import { pino, type DestinationStream, type Logger } from 'pino';
import type { ServerConfig } from '../interfaces/server-config';

/** What could let somebody in or names a person, wherever it stands in what is logged. */
const secret = [
  ...['password', 'passwordHash', 'token', 'tokenHash', 'cookie', 'authorization', 'secret', 'privateKey'],
  ...['email', 'to', 'endpoint', 'p256dh', 'auth', 'signUrl', 'databaseUrl', 'smtpUrl'],
];

/** A failed query tells its parameters in its message, and PostgreSQL the row it refused: both may be anything. */
const withoutParameters = (text: string) => text.replace(/\nparams: [\s\S]*?(?=\n {4}at |\ncaused by: |$)/g, '');

/** A value of the wrong form (SQLSTATE class 22) is quoted by PostgreSQL in its message. */
const isOfValue = (error: unknown): boolean =>
  error instanceof Error && (('code' in error && String(error.code).startsWith('22')) || isOfValue(error.cause));

function told(error: Error): object {
  const { message, stack, type, code } = pino.stdSerializers.err(error) as { message: string; stack: string; type: string; code?: unknown };
  const { cause } = error;
  const clean = (text: string) => (isOfValue(error) ? withoutParameters(text).replace(/"[^"]*"/g, '"…"') : withoutParameters(text));
  return {
    ...{ type, message: clean(message), stack: clean(stack) },
    ...(typeof code === 'string' ? { code } : {}),
    ...(cause instanceof Error ? { cause: clean(cause.message) } : {}),
  };
}

/** Logs as JSON lines, on stderr by default; what could let somebody in or name a person is taken out. */
export function createLog(config: Pick<ServerConfig, 'mode' | 'logLevel'>, destination: DestinationStream = pino.destination(2)): Logger {
  return pino(
    {
      level: config.mode === 'test' ? 'silent' : config.logLevel,
      base: undefined,
      timestamp: pino.stdTimeFunctions.isoTime,
      redact: secret.flatMap((key) => [key, `*.${key}`, `*.*.${key}`, `*.*.*.${key}`]),
      serializers: { err: (error: unknown) => (error instanceof Error ? told(error) : error) },
    },
    destination,
  );
}
