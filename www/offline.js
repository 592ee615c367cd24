// The service worker: after the first visit the page and its demo sites also open without a network. It keeps the program only,
// never a record or a case. The build writes the list of files and a mark of their content into the two lines below.
"use strict";
const FILES = ["./"];
const MARK = "unbuilt";

const CACHE = `millpond-${MARK}`;

self.addEventListener("install", (event) => {
  event.waitUntil(caches.open(CACHE).then((cache) => cache.addAll(FILES)));
});

self.addEventListener("activate", (event) => {
  const old = (name) => name.startsWith("millpond-") && name !== CACHE;
  event.waitUntil(caches.keys().then((names) => Promise.all(names.filter(old).map((name) => caches.delete(name)))));
});

// The network first, so that a visitor with a network never meets an old page; what was kept, when there is none.
self.addEventListener("fetch", (event) => {
  const { request } = event;
  if (request.method !== "GET" || new URL(request.url).origin !== location.origin) return;
  event.respondWith(
    fetch(request).catch(async (error) => {
      const kept = await caches.match(request, { cacheName: CACHE, ignoreSearch: true, ignoreVary: true });
      if (kept) return kept;
      throw error;
    }),
  );
});
