import 'fake-indexeddb/auto';
import { afterEach, beforeEach, expect, test, vi } from 'vitest';
import { Sync } from './sync';
import { newDevice } from './testing';
import { Unreachable, type Transport } from './transport';

const PERSON = '01890000-0000-7000-8000-000000000001';

// A page that no service worker serves yet.
beforeEach(() => {
	vi.stubGlobal('navigator', {});
});
afterEach(() => {
	vi.useRealTimers();
	vi.unstubAllGlobals();
});

/** A server of which only this is known: whether it is asked for its builds. */
function counted() {
	let asked = 0;
	const builds = () => {
		asked++;
		return Promise.reject(new Unreachable('network'));
	};
	return {
		transport: () => ({ builds, live: () => () => undefined }) as unknown as Transport,
		asked: () => asked
	};
}

test('what talks to the server comes once a server answers, and is tried until then', async () => {
	const store = await newDevice(PERSON);
	const request = vi.fn<() => Promise<Response>>(() => Promise.reject(new TypeError('no network')));
	vi.stubGlobal('fetch', request);
	vi.useFakeTimers({ toFake: ['setTimeout', 'clearTimeout'] });
	const { transport, asked } = counted();
	const sync = new Sync(store, transport);
	const heard: string[] = [];
	sync.subscribe(({ phase }) => heard.push(phase));
	expect(sync.status).toMatchObject({ phase: 'idle', synced: false, builds: [] });

	sync.start();
	await vi.waitFor(() => {
		expect(sync.status.phase).toBe('offline');
	});
	await vi.advanceTimersByTimeAsync(5000);
	await vi.waitFor(() => {
		expect(request).toHaveBeenCalledTimes(2);
	});
	expect(asked()).toBe(0);

	request.mockImplementation(() =>
		Promise.resolve(Response.json({ code: 'session.none', says: 'Sign in.' }, { status: 401 }))
	);
	vi.useRealTimers();
	await sync.tryNow();
	expect(asked()).toBe(1);
	expect(heard.at(-1)).toBe('offline');
	sync.stop();
	store.close();
});

test('stopped before it came, it does not begin', async () => {
	const store = await newDevice(PERSON);
	vi.stubGlobal('fetch', () =>
		Promise.resolve(Response.json({ code: 'session.none', says: '' }, { status: 401 }))
	);
	const { transport, asked } = counted();
	const sync = new Sync(store, transport);
	sync.start();
	sync.stop();
	await sync.tryNow();
	expect(asked()).toBe(0);
	store.close();
});
