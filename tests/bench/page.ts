/**
 * What runs in the browser: the device's own code, as the app's screens call it, and beside each measure the same work
 * written by hand on idb and fetch, with the same bytes and the same durability.
 */
import { HOLES } from './holes';
import { openDB, type DBSchema, type IDBPDatabase } from 'idb';
import { appendEntries, type Draft } from '$lib/device/append';
import { SyncLoop, type Status } from '$lib/device/loop';
import { foldedSeam, summaries } from '$lib/device/read';
import { syncRound } from '$lib/device/round';
import { within, type EntryRow } from '$lib/device/schema';
import { openStore, storeName, type DeviceStore } from '$lib/device/store';
import { httpTransport } from '$lib/device/transport';

declare global {
	var tallybarBench: typeof import('./page');
}

async function withStore<T>(person: string, work: (store: DeviceStore) => Promise<T>): Promise<T> {
	const store = await openStore(person);
	try {
		return await work(store);
	} finally {
		store.close();
	}
}

// ---- filling a store ---------------------------------------------------------------------------------------

/** One round with the server. @throws when it did not go through */
export function sync(person: string): Promise<void> {
	return withStore(person, async (store) => {
		const report = await syncRound(store, httpTransport(person));
		const fault = report.fault ?? [...report.builds.values()].find((build) => build.fault)?.fault;
		if (report.outcome !== 'done' || fault)
			throw new Error(JSON.stringify(fault ?? report.outcome));
	});
}

export function append(person: string, build: string, drafts: readonly Draft[]): Promise<void> {
	return withStore(person, async (store) => {
		await appendEntries(store, build, drafts);
	});
}

/** The texts of all lines here, in order of their number. */
export function texts(person: string, build: string): Promise<string[]> {
	return withStore(person, async (store) => {
		const rows = await store.handle.run((db) =>
			db.getAllFromIndex('entries', 'byN', within(build))
		);
		return rows.map(({ text }) => text);
	});
}

/** An assembly and seams of a hundred holes to drive. @returns the seams */
export function plan(person: string, build: string, count: number): Promise<string[]> {
	return withStore(person, async (store) => {
		const assembly = store.newId();
		const seams = Array.from({ length: count }, () => store.newId());
		await appendEntries(store, build, [
			{ id: assembly, kind: 'assembly.planned', assembly, body: { name: 'Bench' } },
			...seams.map((seam, i): Draft => ({
				id: seam,
				kind: 'seam.planned',
				seam,
				body: {
					name: `Seam ${i + 1}`,
					assembly,
					holes: { count: HOLES, first: 1 },
					callout: 'MS20470AD4-4'
				}
			}))
		]);
		return seams;
	});
}

// ---- tap to durable ----------------------------------------------------------------------------------------

interface RawSchema extends DBSchema {
	rows: { key: string; value: { readonly id: string; readonly text: string } };
	waiting: { key: number; value: string };
	lines: { key: number; value: { readonly seq: number; readonly text: string } };
}

function openRaw(name: string): Promise<IDBPDatabase<RawSchema>> {
	return openDB<RawSchema>(name, 1, {
		upgrade(db) {
			db.createObjectStore('rows', { keyPath: 'id' });
			db.createObjectStore('waiting', { autoIncrement: true });
			db.createObjectStore('lines', { keyPath: 'seq' });
		}
	});
}

export interface Pair {
	readonly tallybar: number[];
	readonly floor: number[];
}

/** Drives the holes of these seams one by one, and after each adds one raw record of the same bytes. */
export function taps(person: string, build: string, seams: readonly string[]): Promise<Pair> {
	return withStore(person, async (store) => {
		const raw = await openRaw('tallybar-bench-tap');
		const times: Pair = { tallybar: [], floor: [] };
		const rawAdd = async (id: string, text: string) => {
			const started = performance.now();
			const tx = raw.transaction('rows', 'readwrite', { durability: 'strict' });
			const added = tx.store.add({ id, text });
			await Promise.all([added, tx.done]);
			times.floor.push(performance.now() - started);
		};
		for (const seam of seams) {
			// As the screen does before anybody can tap.
			await foldedSeam(store, build, seam);
			for (let hole = 1; hole <= HOLES; hole++) {
				const draft: Draft = {
					kind: 'holes.driven',
					seam,
					body: {
						holes: [{ from: hole, to: hole }],
						method: 'driven',
						callout: 'MS20470AD4-4',
						shooter: person
					}
				};
				// Who goes first takes turns: each finds the disk as the other left it.
				if (hole % 2 === 0) await rawAdd(store.newId(), JSON.stringify({ ...FRAME, ...draft }));
				const started = performance.now();
				const [entry] = await appendEntries(store, build, [draft]);
				times.tallybar.push(performance.now() - started);
				if (hole % 2 === 1) await rawAdd(store.newId(), JSON.stringify(entry));
			}
		}
		raw.close();
		return times;
	});
}

/** As many bytes as an envelope adds to a draft. */
const FRAME = {
	id: '0'.repeat(36),
	build: '0'.repeat(36),
	device: '0'.repeat(36),
	author: '0'.repeat(36),
	at: '2026-12-01T21:40:05.120+01:00',
	on: [],
	n: 20_000,
	v: 1
};

// ---- a cold store ------------------------------------------------------------------------------------------

/** Opens the store and reads what the bench of a seam shows: the seam, folded, and the summaries of all seams. */
export async function coldRead(
	person: string,
	build: string,
	seam: string
): Promise<{ lines: number; seams: number; ms: number }> {
	const started = performance.now();
	const store = await openStore(person);
	const [folded, all] = await Promise.all([
		foldedSeam(store, build, seam),
		summaries(store, build)
	]);
	const ms = performance.now() - started;
	store.close();
	return { lines: folded.lines.length, seams: all.length, ms };
}

/** The same rows out of the same database, and nothing done with them. */
export async function coldReadRaw(person: string, build: string, seam: string): Promise<number> {
	const started = performance.now();
	const db = await openDB(storeName(person, ''));
	await Promise.all([
		db.getAllFromIndex('entries', 'byPart', within(build, seam)) as Promise<EntryRow[]>,
		db.getAll('summaries', within(build))
	]);
	const ms = performance.now() - started;
	db.close();
	return ms;
}

/** The seam with the most lines among those with holes still to drive. */
export function busiestSeam(person: string, build: string): Promise<string> {
	return withStore(person, async (store) => {
		const all = await summaries(store, build);
		const open = all.filter((seam) => seam.open > 0 && !seam.retired);
		return (open.length > 0 ? open : all).reduce((a, b) => (b.lines > a.lines ? b : a)).seam;
	});
}

// ---- browser to server to browser --------------------------------------------------------------------------

/** Runs the loop until `reached`. @returns when, in ms since 1970 */
function loopUntil(
	store: DeviceStore,
	person: string,
	marks: readonly ((status: Status) => boolean)[]
): Promise<number[]> {
	const loop = new SyncLoop(store, httpTransport(person));
	return new Promise((resolve) => {
		const at: number[] = [];
		loop.subscribe((status) => {
			for (let mark = marks[at.length]; mark?.(status); mark = marks[at.length])
				at.push(Date.now());
			if (at.length < marks.length) return;
			loop.stop();
			resolve(at);
		});
		loop.start();
	});
}

/** Everything that waits goes out. @returns when all was acknowledged, and when all had come back */
export function sendAll(person: string): Promise<{ acknowledged: number; synced: number }> {
	return withStore(person, async (store) => {
		const [acknowledged = 0, synced = 0] = await loopUntil(store, person, [
			// Before the store was looked at there are no builds, and nothing waits in them.
			({ builds, waiting }) => builds.length > 0 && waiting === 0,
			(status) => status.synced
		]);
		return { acknowledged, synced };
	});
}

/** Follows the server until so many lines are here, on the disk. @returns when */
export function receiveAll(person: string, lines: number): Promise<number> {
	return withStore(person, async (store) => {
		await loopUntil(store, person, [({ builds }) => builds.some(({ cursor }) => cursor >= lines)]);
		// What was written before it in the same database is then on the disk too.
		await store.handle.run(async (db) => {
			const tx = db.transaction('drafts', 'readwrite', { durability: 'strict' });
			await Promise.all([tx.store.put({ key: 'bench', json: '' }), tx.done]);
		});
		return Date.now();
	});
}

/** The lines of a build that are here. */
export function countLines(person: string, build: string): Promise<number> {
	return withStore(person, (store) =>
		store.handle.run(async (db) => (await db.get('builds', build))?.lines ?? 0)
	);
}

// ---- the same by hand --------------------------------------------------------------------------------------

const BATCH = 200;

export async function rawFill(name: string, all: readonly string[]): Promise<void> {
	const db = await openRaw(name);
	const tx = db.transaction('waiting', 'readwrite', { durability: 'strict' });
	for (const text of all) void tx.store.add(text);
	await tx.done;
	db.close();
}

/** @returns when everything was acknowledged */
export async function rawSend(name: string): Promise<number> {
	const db = await openRaw(name);
	for (;;) {
		const [keys, entries] = await Promise.all([
			db.getAllKeys('waiting', undefined, BATCH),
			db.getAll('waiting', undefined, BATCH)
		]);
		const last = keys.at(-1);
		if (last === undefined) break;
		const answer = await fetch('/lines', { method: 'POST', body: JSON.stringify({ entries }) });
		if (!answer.ok) throw new Error(await answer.text());
		const tx = db.transaction('waiting', 'readwrite', { durability: 'relaxed' });
		await Promise.all([tx.store.delete(IDBKeyRange.upperBound(last)), tx.done]);
	}
	db.close();
	return Date.now();
}

/** @returns when so many lines were here, on the disk */
export async function rawReceive(name: string, lines: number): Promise<number> {
	const db = await openRaw(name);
	for (let after = 0; after < lines;) {
		const answer = await fetch(`/lines?after=${after}`, { cache: 'no-store' });
		const page = (await answer.json()) as { seq: number; text: string }[];
		const last = page.at(-1);
		if (!last) {
			await new Promise((resolve) => setTimeout(resolve, 20));
			continue;
		}
		const tx = db.transaction('lines', 'readwrite', { durability: 'relaxed' });
		for (const line of page) void tx.store.put(line);
		await tx.done;
		after = last.seq;
	}
	const tx = db.transaction('rows', 'readwrite', { durability: 'strict' });
	await Promise.all([tx.store.put({ id: 'done', text: '' }), tx.done]);
	db.close();
	return Date.now();
}
