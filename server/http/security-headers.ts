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

/**
 * The content security policy for the built page: nothing inline but what the build itself wrote, by hash. The hash
 * of the empty text lets react-native-web make its style element, which it then fills through the CSSOM.
 */
function contentSecurityPolicy(indexHtml: string): Record<string, string[]> {
  return {
    'default-src': ["'self'"],
    'script-src': ["'self'", ...inlineTexts(indexHtml, 'script').map(hashOf)],
    'style-src': ["'self'", ...new Set(['', ...inlineTexts(indexHtml, 'style')].map(hashOf))],
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

export function securityHeaders(config: ServerConfig, indexHtml: string): RequestHandler {
  const overTls = config.publicUrl?.startsWith('https:') ?? false;
  return helmet({
    contentSecurityPolicy: { useDefaults: false, directives: contentSecurityPolicy(indexHtml) },
    strictTransportSecurity: overTls ? { maxAge: 31_536_000, includeSubDomains: false } : false,
    referrerPolicy: { policy: 'no-referrer' },
    crossOriginEmbedderPolicy: false,
  });
}
