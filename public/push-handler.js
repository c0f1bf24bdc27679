/* Push messages, for the service worker: it imports this file. What is shown was decided by the server; nothing here asks the API. */
self.addEventListener('push', (event) => {
  const { title = 'Evenfall', body = '', path = '/', tag = 'evenfall', quiet = false } = readMessage(event.data);
  event.waitUntil(
    self.registration.showNotification(title, {
      body,
      tag,
      renotify: !quiet,
      silent: quiet,
      requireInteraction: !quiet,
      icon: '/icon.svg',
      data: { path },
    }),
  );
});

self.addEventListener('notificationclick', (event) => {
  event.notification.close();
  const { path = '/' } = event.notification.data ?? {};
  event.waitUntil(openPage(new URL(path, self.location.origin)));
});

/** A message that cannot be read is shown all the same: somebody wanted to say something. */
function readMessage(data) {
  try {
    return data === null ? {} : data.json();
  } catch {
    return { body: data.text() };
  }
}

/** A page of the application that is open comes to the front and goes there; else a new one is opened. */
async function openPage(url) {
  if (url.origin !== self.location.origin) return;
  const [page] = await self.clients.matchAll({ type: 'window', includeUncontrolled: true });
  if (page === undefined) {
    await self.clients.openWindow(url.href);
    return;
  }
  await page.focus();
  await page.navigate(url.href).catch(() => self.clients.openWindow(url.href));
}
