import type { Request, Response } from 'express';
import type { ServerConfig } from '../interfaces/server-config';

const overTls = (config: ServerConfig) => config.publicUrl?.startsWith('https:') ?? false;

/** `__Host-` binds the cookie to this very host and to TLS; plain http on loopback cannot carry it. */
const cookieName = (config: ServerConfig) => (overTls(config) ? '__Host-ef' : 'ef');

/** Session token of a request, or null. */
export function readSessionToken(req: Request, config: ServerConfig): string | null {
  const wanted = `${cookieName(config)}=`;
  const part = (req.headers.cookie ?? '')
    .split(';')
    .map((text) => text.trim())
    .find((text) => text.startsWith(wanted));
  const token = part?.slice(wanted.length) ?? '';
  return /^[\w.~-]{16,256}$/.test(token) ? token : null;
}

const attributes = (config: ServerConfig) => ({ httpOnly: true, sameSite: 'lax', path: '/', secure: overTls(config) }) as const;

export function setSessionCookie(res: Response, config: ServerConfig, session: { token: string; expiresAt: Date }): void {
  res.cookie(cookieName(config), session.token, { ...attributes(config), expires: session.expiresAt });
}

export function clearSessionCookie(res: Response, config: ServerConfig): void {
  res.clearCookie(cookieName(config), attributes(config));
}
