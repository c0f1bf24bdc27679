import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import express, { Router, type Response } from 'express';

/** The built single page, or a plain page that says what is missing. */
export function readIndexHtml(webDir: string | null): string {
  const file = webDir === null ? null : join(webDir, 'index.html');
  if (file !== null && existsSync(file)) return readFileSync(file, 'utf8');
  return '<!doctype html><html lang="en"><head><meta charset="utf-8"><title>Evenfall</title></head><body><p>The web application is not built yet. The API answers under /api.</p></body></html>';
}

const yearS = 31_536_000;

/** Names made by the bundler carry a hash of the content and never change; everything else is asked for again. */
function setCaching(res: Response, path: string): void {
  const hashed = /[\\/]_expo[\\/]static[\\/]|[.-][0-9a-f]{20,}\./.test(path);
  res.set('Cache-Control', hashed ? `public, max-age=${String(yearS)}, immutable` : 'no-cache');
}

/** Files of the web application, and its one page for every other address. */
export function webFiles(webDir: string | null, indexHtml: string): Router {
  const router = Router();
  if (webDir !== null) {
    for (const folder of ['/_expo', '/assets'])
      router.use(
        folder,
        express.static(join(webDir, folder), { fallthrough: false, index: false, redirect: false, setHeaders: setCaching }),
      );
    router.use(express.static(webDir, { index: false, redirect: false, setHeaders: setCaching }));
  }
  router.get('/{*rest}', (_req, res) => {
    res.set('Cache-Control', 'no-cache').type('html').send(indexHtml);
  });
  return router;
}
