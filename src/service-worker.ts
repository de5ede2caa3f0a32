/// <reference types="@sveltejs/kit" />
/// <reference no-default-lib="true"/>
/// <reference lib="esnext" />
/// <reference lib="webworker" />
import {
	cleanupOutdatedCaches,
	createHandlerBoundToURL,
	precacheAndRoute
} from 'workbox-precaching';
import type { PrecacheEntry } from 'workbox-precaching';
import { NavigationRoute, registerRoute } from 'workbox-routing';
import { isDeskPath } from '$lib/device/desk-paths';

declare const self: ServiceWorkerGlobalScope & { __WB_MANIFEST: (string | PrecacheEntry)[] };

precacheAndRoute(self.__WB_MANIFEST);
cleanupOutdatedCaches();

// Every page works from the shell, also one never visited and with the server gone. The log's own
// requests are never answered from a cache: only the server may say what it has accepted.
const shell = createHandlerBoundToURL('shell');
registerRoute(
	new NavigationRoute(
		async (options) => {
			if (!isDeskPath(options.url.pathname)) return shell(options);
			try {
				return await fetch(options.request);
			} catch {
				return shell(options);
			}
		},
		{ denylist: [/^\/api\//, /^\/healthz$/, /^\/readyz$/, /\/[^/]+\.[a-z0-9]+$/i] }
	)
);

// Only a person who was asked lets a new version take over: an old tab whose scripts were replaced
// under it fails at its next page.
self.addEventListener('message', (event) => {
	if ((event.data as { type?: unknown } | null)?.type === 'SKIP_WAITING') void self.skipWaiting();
});
