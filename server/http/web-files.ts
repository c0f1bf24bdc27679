import { existsSync, readdirSync, readFileSync } from 'node:fs';
import { extname, join, sep } from 'node:path';
import express, { Router, type Request, type RequestHandler, type Response } from 'express';

/**
 * The pages of the web application: the one for every address, the sign-in page as it stands before the program has come, and the page that a
 * browser keeps for when the server does not answer (empty where nothing is built).
 */
export interface WebPages {
  index: string;
  signIn: string;
  offline: string;
}

/** The built pages, or a plain page that says what is missing. */
export function readWebPages(webDir: string | null): WebPages {
  const read = (name: string) => {
    const file = webDir === null ? null : join(webDir, name);
    return file !== null && existsSync(file) ? readFileSync(file, 'utf8') : null;
  };
  const index = read('index.html') ?? notBuilt;
  return { index, signIn: read('sign-in.html') ?? index, offline: read('offline.html') ?? '' };
}

const notBuilt =
  '<!doctype html><html lang="en"><head><meta charset="utf-8"><title>Evenfall</title></head><body><p>The web application is not built yet. The API answers under /api.</p></body></html>';

const yearS = 31_536_000;

const packedEnding = '.br';

/** Names made by the bundler carry a hash of the content and never change; everything else is asked for again. */
function setHeaders(res: Response, path: string): void {
  const hashed = /[\\/]_expo[\\/]static[\\/]|[.-][0-9a-f]{20,}\./.test(path);
  res.set('Cache-Control', hashed ? `public, max-age=${String(yearS)}, immutable` : 'no-cache');
  if (path.endsWith(packedEnding)) res.set('Content-Encoding', 'br').type(extname(path.slice(0, -packedEnding.length)));
}

/**
 * Sends the Brotli copy that the build left beside a file to everybody who takes it; others get the file itself, packed on the way. The
 * names of the copies are read once: a build replaces the whole folder, and the server begins anew with it.
 */
function preferPacked(webDir: string): RequestHandler {
  const below = existsSync(webDir) ? readdirSync(webDir, { recursive: true, encoding: 'utf8' }) : [];
  const packed = new Set(below.filter((path) => path.endsWith(packedEnding)).map((path) => `/${path.split(sep).join('/')}`));
  return (req, res, next) => {
    const path = `${req.path}${packedEnding}`;
    if (packed.has(path)) {
      res.vary('Accept-Encoding');
      if (req.acceptsEncodings('br') === 'br') req.url = path;
    }
    next();
  };
}

/**
 * Files of the web application, and its page for every other address. Who comes without a session is sent from the front door to the sign-in page
 * at once, instead of by the program when it has come.
 */
export function webFiles(webDir: string | null, { pages, hasSession }: { pages: WebPages; hasSession: (req: Request) => boolean }): Router {
  const router = Router();
  if (webDir !== null) {
    router.use(preferPacked(webDir));
    for (const folder of ['/_expo', '/assets'])
      router.use(folder, express.static(join(webDir, folder), { fallthrough: false, index: false, redirect: false, setHeaders }));
    router.use(express.static(webDir, { index: false, redirect: false, setHeaders }));
  }
  router.get('/', (req, res, next) => {
    if (hasSession(req)) next();
    else res.set('Cache-Control', 'no-store').redirect(302, '/sign-in');
  });
  router.get('/{*rest}', (req, res) => {
    const page = req.path === '/sign-in' ? pages.signIn : pages.index;
    res.set('Cache-Control', 'no-cache').type('html').send(page);
  });
  return router;
}
