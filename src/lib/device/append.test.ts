import 'fake-indexeddb/auto';
import { openDB } from 'idb';
import { afterEach, describe, expect, test, vi } from 'vitest';
import { readEntry } from '$lib/logbook/entry';
import { Id } from '$lib/logbook/scalars';
import { appendEntries } from './append';
import { DeviceError } from './errors';
import { builds, foldedSeam, newestLines, outboxCounts, outboxRows, summaries } from './read';
import { lastPerson, personsHere } from './registry';
import { openStore, storeName, type DeviceStore } from './store';
import { driven, newDevice, openBuild, planned } from './testing';

const ADA = '01890000-0000-7000-8000-00000000000a';

const texts = async (store: DeviceStore, build: string) =>
	(await newestLines(store, build, { limit: 1000 })).map(({ text }) => text).reverse();
const kinds = async (store: DeviceStore, build: string) =>
	(await texts(store, build)).map((text) => {
		const reading = readEntry(text);
		return reading.ok ? reading.entry.kind : reading.code;
	});

async function codeOf(attempt: Promise<unknown>): Promise<string> {
	const error: unknown = await attempt.then(
		() => 'nothing was refused',
		(reason: unknown) => reason
	);
	return error instanceof DeviceError ? error.code : String(error);
}

afterEach(() => {
	vi.restoreAllMocks();
});

describe('a line that was saved', () => {
	test('was written in one strict transaction, with its outbox row and summary', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const made: IDBTransaction[] = [];
		const transaction = vi.spyOn(IDBDatabase.prototype, 'transaction');
		transaction.mockImplementation(function (this: IDBDatabase, ...args) {
			transaction.mockRestore();
			const tx = this.transaction(...args);
			made.push(tx);
			return tx;
		});
		await appendEntries(store, build, [driven(seam, 1, 5)]);
		expect(made).toHaveLength(1);
		expect(made[0]?.durability).toBe('strict');
		expect([...(made[0]?.objectStoreNames ?? [])]).toEqual([
			'builds',
			'entries',
			'outbox',
			'summaries'
		]);
		expect((await summaries(store, build)).map(({ driven: rivets }) => rivets)).toEqual([5]);
		expect(await outboxCounts(store, build)).toMatchObject({ waiting: 5, refused: 0 });
	});

	test('is numbered one beyond the highest known, and the device enrols once, after the opening', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		await appendEntries(store, build, [driven(seam, 1), driven(seam, 2)]);
		expect(await kinds(store, build)).toEqual([
			'build.opened',
			'device.enrolled',
			'assembly.planned',
			'seam.planned',
			'holes.driven',
			'holes.driven'
		]);
		const rows = await outboxRows(store, build);
		expect(rows.map(({ n }) => n)).toEqual([1, 2, 3, 4, 5, 6]);
		expect(rows.every(({ id }) => Id.safeParse(id).success)).toBe(true);
	});

	test('is found by another connection, folded the same', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		await appendEntries(store, build, [driven(seam, 3)]);
		const again = await openStore(ADA, { prefix: store.prefix });
		expect(again.device).toBe(store.device);
		expect(
			(await foldedSeam(again, build, seam)).holes.filter((h) => h.state === 'driven')
		).toEqual((await foldedSeam(store, build, seam)).holes.filter((h) => h.state === 'driven'));
		expect(await builds(again)).toMatchObject([{ build, name: 'Test build', role: 'owner' }]);
	});

	test('is told to whoever listens, with the seams it touched', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const heard: unknown[] = [];
		const stop = store.subscribe((notice) => heard.push(notice));
		await appendEntries(store, build, [driven(seam, 1)]);
		stop();
		await appendEntries(store, build, [driven(seam, 2)]);
		expect(heard).toEqual([{ build, parts: [seam], appended: true }]);
	});
});

describe('a line whose transaction was committed before its connection broke', () => {
	/** The first piece of work ends, and then its connection says that it was cut. */
	function cutAfterFirst(store: DeviceStore): void {
		const run = store.handle.run.bind(store.handle);
		let first = true;
		store.handle.run = (work) =>
			run(async (db) => {
				const result = await work(db);
				if (!first) return result;
				first = false;
				throw new DOMException('cut by the browser', 'UnknownError');
			});
	}

	test('is answered as saved, is there once, and is told', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const heard: unknown[] = [];
		store.subscribe((notice) => heard.push(notice));
		cutAfterFirst(store);
		const [entry] = await appendEntries(store, build, [driven(seam, 1)]);
		expect(entry).toMatchObject({ kind: 'holes.driven', seam, author: ADA });
		expect((await kinds(store, build)).filter((kind) => kind === 'holes.driven')).toHaveLength(1);
		expect(heard).toEqual([{ build, parts: [seam], appended: true }]);
		expect((await foldedSeam(store, build, seam)).holes[0]?.state).toBe('driven');
	});

	test('is not confused with other content under its id', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const id = store.newId();
		await appendEntries(store, build, [{ ...driven(seam, 1), id }]);
		expect(await codeOf(appendEntries(store, build, [{ ...driven(seam, 2), id }]))).toBe(
			'device.store_lost'
		);
		const on = [build];
		expect(await codeOf(appendEntries(store, build, [{ ...driven(seam, 1), id, on }]))).toBe(
			'device.store_lost'
		);
		expect(await appendEntries(store, build, [{ ...driven(seam, 1), id }])).toMatchObject([{ id }]);
	});
});

describe('two connections to one store', () => {
	test('appending at once get different numbers, and both see all summed', async () => {
		const one = await newDevice(ADA);
		const { build, seam } = await openBuild(one, 100);
		const two = await openStore(ADA, { prefix: one.prefix });
		await Promise.all(
			Array.from({ length: 40 }, (_, i) =>
				appendEntries(i % 2 ? one : two, build, [driven(seam, i + 1)])
			)
		);
		const numbers = (await outboxRows(one, build)).map(({ n }) => n);
		expect(numbers).toEqual(Array.from({ length: 44 }, (_, i) => i + 1));
		expect(await summaries(two, build)).toMatchObject([{ driven: 40, open: 60 }]);
		expect(await kinds(one, build)).toSatisfy(
			(all: string[]) => all.filter((kind) => kind === 'device.enrolled').length === 1
		);
	});
});

describe('a line that was not saved', () => {
	test('leaves nothing when the quota is used up, and says so', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const before = await texts(store, build);
		// eslint-disable-next-line @typescript-eslint/unbound-method -- called with its own `this` below
		const put = IDBObjectStore.prototype.put;
		vi.spyOn(IDBObjectStore.prototype, 'put').mockImplementation(function (
			this: IDBObjectStore,
			...args
		) {
			const request = put.apply(this, args);
			// As a browser does it: the request is taken, the transaction fails with the reason.
			const tx = this.transaction as unknown as { _abort: (name: string) => void };
			tx._abort('QuotaExceededError');
			return request;
		});
		expect(await codeOf(appendEntries(store, build, [driven(seam, 1)]))).toBe('device.full');
		vi.restoreAllMocks();
		expect(await texts(store, build)).toEqual(before);
		expect(await outboxCounts(store, build)).toMatchObject({ waiting: before.length });
	});

	test('leaves nothing when the browser aborts in the middle, also of a batch', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const before = await texts(store, build);
		let adds = 0;
		// eslint-disable-next-line @typescript-eslint/unbound-method -- called with its own `this` below
		const add = IDBObjectStore.prototype.add;
		vi.spyOn(IDBObjectStore.prototype, 'add').mockImplementation(function (
			this: IDBObjectStore,
			...args
		) {
			const request = add.apply(this, args);
			if (++adds % 5 === 0) this.transaction.abort();
			return request;
		});
		const many = Array.from({ length: 6 }, (_, i) => driven(seam, i + 1));
		expect(await codeOf(appendEntries(store, build, many))).toBe('device.store_lost');
		vi.restoreAllMocks();
		expect(adds).toBeGreaterThan(4);
		expect(await texts(store, build)).toEqual(before);
		await appendEntries(store, build, [driven(seam, 1)]);
		expect(await outboxCounts(store, build)).toMatchObject({ waiting: before.length + 1 });
	});

	test('names the fault of an invalid draft and keeps none of its batch', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const before = await texts(store, build);
		const bad = { ...driven(seam, 2), body: { holes: [], method: 'driven' as const } };
		expect(await codeOf(appendEntries(store, build, [driven(seam, 1), bad]))).toBe(
			'entry.malformed'
		);
		expect(await texts(store, build)).toEqual(before);
	});

	test('is refused for a build that is not here, and the first draft of a new one must open it', async () => {
		const store = await newDevice(ADA);
		const build = store.newId();
		expect(await codeOf(appendEntries(store, build, [planned(store.newId(), build)]))).toBe(
			'build.unknown'
		);
		expect(await builds(store)).toEqual([]);
	});
});

describe('the connection', () => {
	test('that was cut is opened again, once, and the line is saved', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		await store.handle.run((db) => {
			db.close();
			return Promise.resolve();
		});
		await appendEntries(store, build, [driven(seam, 1)]);
		expect(await summaries(store, build)).toMatchObject([{ driven: 1 }]);
	});

	test('to a store of a newer app is opened without a version', async () => {
		const first = await newDevice(ADA);
		const { build, seam } = await openBuild(first);
		first.close();
		const newer = await openDB(storeName(ADA, first.prefix), 9, {
			upgrade: (db) => {
				db.createObjectStore('from the future');
			}
		});
		newer.close();
		const store = await openStore(ADA, { prefix: first.prefix });
		await appendEntries(store, build, [driven(seam, 1)]);
		expect(await summaries(store, build)).toMatchObject([{ driven: 1 }]);
	});

	test('gives way to an upgrade by another tab', async () => {
		const store = await newDevice(ADA);
		await openBuild(store);
		const newer = await openDB(storeName(ADA, store.prefix), 9, {
			upgrade: (db) => {
				db.createObjectStore('from the future');
			}
		});
		expect(newer.version).toBe(9);
		newer.close();
		expect(await builds(store)).toHaveLength(1);
	});
});

describe('a new device id', () => {
	test('enrols again, and the old key is kept for the old lines', async () => {
		const store = await newDevice(ADA);
		const { build, seam } = await openBuild(store);
		const old = store.device;
		const fresh = await store.mintDevice();
		await appendEntries(store, build, [driven(seam, 1)]);
		expect((await kinds(store, build)).slice(-2)).toEqual(['device.enrolled', 'holes.driven']);
		expect((await store.keysOf(old))?.device).toBe(old);
		const again = await openStore(ADA, { prefix: store.prefix });
		expect(again.device).toBe(fresh);
	});

	test('reaches the other tabs', async () => {
		const one = await newDevice(ADA);
		const two = await openStore(ADA, { prefix: one.prefix });
		const fresh = await one.mintDevice();
		await vi.waitFor(() => {
			expect(two.device).toBe(fresh);
		});
	});
});

test('the registry knows who was here last', async () => {
	const store = await newDevice(ADA, { name: 'Ada' });
	expect(await lastPerson(store)).toMatchObject({ person: ADA, name: 'Ada', state: 'open' });
	expect(await personsHere(store)).toHaveLength(1);
});
