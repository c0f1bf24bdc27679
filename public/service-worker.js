/*
 * Keeps the built program on the device, so that a page with a bad network finds its parts, and shows offline.html where the server does not
 * answer. It keeps nothing that the server says: whatever lies under /api, event streams above all, passes it by untouched, and nothing is sent
 * again or later. Push messages have a file of their own. The build writes its version and the files it keeps into the line below.
 */
importScripts('/push-handler.js');
const build = { version: 'unbuilt', files: [] };

const offlinePage = '/offline.html';
const cacheName = 'evenfall-' + build.version;
/** Longer than a slow line takes for the page, shorter than a person looks at an empty screen, ms. */
const longestMs = 12000;

/**
 * What is done with a request: `page`: from the network, else the offline page; `part`: a file of the build, from the device; null: nothing, the
 * browser goes on as if this worker were not there.
 */
function routeOf({ method, mode, url }, { origin, files }) {
  const { origin: of, pathname } = new URL(url);
  if (method !== 'GET' || of !== origin) return null;
  if (/^\/(api|problems)(\/|$)/.test(pathname)) return null;
  if (files.includes(pathname)) return 'part';
  return mode === 'navigate' ? 'page' : null;
}

/** Said by what stands before the server when the server itself does not answer. */
const isGatewayError = ({ status }) => status === 502 || status === 503 || status === 504;

async function pageFor(request) {
  let timer;
  const tooLong = new Promise((_, reject) => {
    timer = setTimeout(() => reject(new Error('no answer')), longestMs);
  });
  try {
    const response = await Promise.race([fetch(request), tooLong]);
    if (!isGatewayError(response)) return response;
  } catch {
    // No answer: said by the offline page.
  } finally {
    clearTimeout(timer);
  }
  return (await caches.match(offlinePage, { cacheName })) ?? Response.error();
}

/** Names carry a hash of the content, so a copy kept by an earlier version is as good. */
async function partFor(request) {
  return (await caches.match(request.url, { ignoreVary: true })) ?? fetch(request);
}

async function keepFiles() {
  const cache = await caches.open(cacheName);
  await cache.addAll([...build.files, offlinePage].map((path) => new Request(path, { cache: 'no-cache' })));
}

/** The version before stays for pages that are still open on it. */
async function forgetOldVersions() {
  const others = (await caches.keys()).filter((name) => name.startsWith('evenfall-') && name !== cacheName);
  await Promise.all(others.slice(0, -1).map((name) => caches.delete(name)));
}

self.addEventListener('install', (event) => event.waitUntil(keepFiles()));
self.addEventListener('activate', (event) => event.waitUntil(forgetOldVersions()));
self.addEventListener('message', (event) => {
  // Only a person at a page says so.
  if (event.data === 'use-new-version') void self.skipWaiting();
});
self.addEventListener('fetch', (event) => {
  const { request } = event;
  const route = routeOf(request, { origin: self.location.origin, files: build.files });
  if (route === 'page') event.respondWith(pageFor(request));
  else if (route === 'part') event.respondWith(partFor(request));
});
