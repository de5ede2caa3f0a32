const HOUR = 60 * 60 * 1000;

/**
 * Registers the service worker and calls `onReady` with the function that lets a waiting version
 * take over. Nothing reloads until a person asked for it in this tab or another.
 *
 * A page that is never reloaded never looks for a new version by itself, so it looks each hour and
 * whenever the tab is shown again. Returns the function that stops looking.
 */
export function watchForUpdates(onReady: (accept: () => void) => void): () => void {
	const stop = new AbortController();
	void register(onReady, stop.signal);
	return () => {
		stop.abort();
	};
}

async function register(onReady: (accept: () => void) => void, stop: AbortSignal): Promise<void> {
	if (!('serviceWorker' in navigator)) return;
	const { registerSW } = await import('virtual:pwa-register');
	const accept = registerSW({
		immediate: true,
		onNeedRefresh: () => {
			onReady(() => void accept());
		},
		onRegisteredSW: (url, registration) => {
			if (registration === undefined) return;
			const look = () => void lookForUpdate(url, registration);
			const timer = setInterval(look, HOUR);
			const onShown = () => {
				if (document.visibilityState === 'visible') look();
			};
			document.addEventListener('visibilitychange', onShown);
			stop.addEventListener('abort', () => {
				clearInterval(timer);
				document.removeEventListener('visibilitychange', onShown);
			});
		}
	});
}

/** A server that is gone or answers with an error must not disturb the installed version. */
async function lookForUpdate(url: string, registration: ServiceWorkerRegistration): Promise<void> {
	if (registration.installing !== null || !navigator.onLine) return;
	try {
		const answer = await fetch(url, { cache: 'no-store', signal: AbortSignal.timeout(15_000) });
		if (answer.ok) await registration.update();
	} catch {
		// No network: the next hour or the next look at the tab tries again.
	}
}
