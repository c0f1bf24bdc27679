import { createHash } from 'node:crypto';
import type { RequestHandler } from 'express';
import helmet from 'helmet';
import type { ServerConfig } from '../interfaces/server-config';

const hashOf = (text: string) => `'sha256-${createHash('sha256').update(text, 'utf8').digest('base64')}'`;

/** Texts of the inline elements of a page, as a browser hashes them. */
function inlineTexts(html: string, element: 'style' | 'script'): string[] {
  const all = html.matchAll(new RegExp(`<${element}((?:\\s[^>]*)?)>([\\s\\S]*?)</${element}>`, 'gi'));
  return [...all].filter(([, attributes = '']) => !/\ssrc\s*=/i.test(attributes)).map(([, , text = '']) => text);
}

const hashesOf = (pages: readonly string[], element: 'style' | 'script') => [
  ...new Set(pages.flatMap((page) => inlineTexts(page, element)).map(hashOf)),
];

/**
 * The content security policy for the built pages: nothing inline but what the build itself wrote, by hash. The hash
 * of the empty text lets react-native-web make its style element, which it then fills through the CSSOM.
 */
function contentSecurityPolicy(pages: readonly string[]): Record<string, string[]> {
  return {
    'default-src': ["'self'"],
    'script-src': ["'self'", ...hashesOf(pages, 'script')],
    'style-src': ["'self'", ...new Set([hashOf(''), ...hashesOf(pages, 'style')])],
    'img-src': ["'self'", 'data:', 'blob:'],
    'font-src': ["'self'"],
    'connect-src': ["'self'"],
    'manifest-src': ["'self'"],
    'worker-src': ["'self'"],
    'object-src': ["'none'"],
    'base-uri': ["'none'"],
    'frame-ancestors': ["'none'"],
    'form-action': ["'self'"],
  };
}

/** The light-spot reader uses a camera; nothing of ours uses the rest, and no page in a frame may use any. */
const permissions = 'camera=(self), microphone=(), geolocation=(), display-capture=()';

export function securityHeaders(config: ServerConfig, pages: readonly string[]): RequestHandler {
  const overTls = config.publicUrl?.startsWith('https:') ?? false;
  const others = helmet({
    contentSecurityPolicy: { useDefaults: false, directives: contentSecurityPolicy(pages) },
    strictTransportSecurity: overTls ? { maxAge: 31_536_000, includeSubDomains: false } : false,
    referrerPolicy: { policy: 'no-referrer' },
    crossOriginEmbedderPolicy: false,
  });
  return (req, res, next) => {
    res.setHeader('Permissions-Policy', permissions);
    others(req, res, next);
  };
}
