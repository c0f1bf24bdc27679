import type { Request } from 'express';
import type { ServerConfig } from '../interfaces/server-config';

const loopbackHost = /^(localhost|127\.0\.0\.1|\[::1\])(:\d{1,5})?$/i;

/**
 * The address under which people reach this server, for links in mails. Without a configured address the host named by
 * the request is taken only on loopback: anybody may write any host into a request, and a link to it would give the
 * token of the mail away.
 */
export function originForLinks(req: Request, config: ServerConfig): string {
  if (config.publicUrl !== null) return config.publicUrl;
  const named = req.headers.host ?? '';
  return loopbackHost.test(named) ? `http://${named}` : `http://${config.host}:${String(config.port)}`;
}
