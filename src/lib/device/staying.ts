/**
 * A build that is made on this device and stays on it: filled in one go, emptied, made anew, left. It lies in a store of
 * its own (`openStayingStore`), so nothing of it can be offered to a server or be taken for somebody's work.
 *
 * What must hold: the build's row is written last, in one transaction that counts the lines. While there is no row the
 * build is not here, whatever else a tab closed in the middle left behind; it is cleared and made anew.
 */
import { deleteDB } from 'idb';
import { canonicalText, hashText, tidy } from '$lib/logbook/bytes';
import { partOf, type Entry } from '$lib/logbook/entry';
import { gather } from '$lib/logbook/fold/gather';
import type { Line } from '$lib/logbook/fold/line';
import { foldSeam } from '$lib/logbook/fold/seam';
import { summarise } from '$lib/logbook/fold/summary';
import type { CrewMember } from '$lib/logbook/wire';
import { newBuildRow, placeless } from './append';
import { settled, writing } from './counting';
import { DeviceError } from './errors';
import { quiet } from './handle';
import { ALL_STORES, within, type StoreName } from './schema';
import type { DeviceStore } from './store';

export interface MadeBuild {
	readonly build: string;
	readonly name: string;
	/** As themselves in it; the store's person is one of them. */
	readonly crew: readonly CrewMember[];
	/** Well formed, and each acceptable after those before it: they are not judged again. */
	readonly entries: readonly Entry[];
}

/** Seams written so far. */
export interface Making {
	readonly seams: number;
	readonly of: number;
}

/** Seams written with one transaction: few enough that the page can say in between how far it is. */
const SEAMS_AT_ONCE = 5;
/** Everything but who writes here: the store keeps its device and its key. */
const OF_BUILDS = ALL_STORES.filter((name) => name !== 'meta');

/** Is the whole build here? */
export async function isMade(store: DeviceStore, build: string): Promise<boolean> {
	return (await store.handle.run((db) => db.getKey('builds', build))) !== undefined;
}

/**
 * Makes the build, where it is not here whole or is wanted anew. Tabs take turns, and who comes second finds it made.
 * @param make asked for only when it is needed
 * @throws DeviceError `device.full` without room, `device.store_lost` when lines are missing at the end
 */
export async function ensureMade(
	store: DeviceStore,
	build: string,
	make: () => Promise<MadeBuild>,
	{ anew = false, onprogress }: { anew?: boolean; onprogress?: (making: Making) => void } = {}
): Promise<void> {
	const work = async () => {
		if (!anew && (await isMade(store, build))) return;
		await clear(store, build);
		await fill(store, await make(), onprogress);
	};
	const locks = (globalThis as { navigator?: { locks?: LockManager } }).navigator?.locks;
	if (locks) await locks.request(store.handle.name, work);
	else await work();
}

/** How many lines were written here since the build was made. */
export async function ownLines(store: DeviceStore, build: string): Promise<number> {
	return store.handle.run(async (db) => {
		const tx = db.transaction(['builds', 'entries', 'meta']);
		const row = await tx.objectStore('builds').get(build);
		const made = await tx.objectStore('meta').get(`made:${build}`);
		if (!row || made?.is !== 'made') return 0;
		const since = IDBKeyRange.bound([build, made.maxN], [build, []], true);
		const lines = await tx.objectStore('entries').index('byN').count(since);
		// The enrolment of this device came by itself.
		return lines - row.enrolled.length;
	});
}

/** Deletes the store of this build and all that is in it. */
export async function discardStore(store: DeviceStore, build: string): Promise<void> {
	await inOne(store, ALL_STORES, 'strict', (tx) => {
		for (const name of ALL_STORES) quiet(tx.objectStore(name).clear());
	});
	store.notices.send({ build, parts: [''] });
	store.close();
	// Empty already. Another tab may keep the empty shell open for a while; nobody waits for that.
	deleteDB(store.handle.name).catch(() => undefined);
}

async function clear(store: DeviceStore, build: string): Promise<void> {
	await inOne(store, OF_BUILDS, 'relaxed', (tx) => {
		for (const name of OF_BUILDS) quiet(tx.objectStore(name).clear());
	});
	store.cache.forget(build);
	store.notices.send({ build, parts: [''] });
}

async function fill(
	store: DeviceStore,
	{ build, name, crew, entries }: MadeBuild,
	onprogress: ((making: Making) => void) | undefined
): Promise<void> {
	const parts = new Map<string, Entry[]>();
	for (const entry of entries) gather(parts, partOf(entry), entry);
	const ofTheBuild = parts.get('') ?? [];
	parts.delete('');
	const seams = [...parts];
	// The next seams are folded while the browser writes those before them.
	let written = Promise.resolve();
	for (let at = 0; at < seams.length; at += SEAMS_AT_ONCE) {
		onprogress?.({ seams: at, of: seams.length });
		const some = seams.slice(at, at + SEAMS_AT_ONCE).map(([seam, lines]) => ({
			seam,
			rows: rowsOf(lines),
			summary: summarise(foldSeam(seam, lines.map(lineOf)))
		}));
		await written;
		written = inOne(store, ['entries', 'summaries'], 'relaxed', (tx) => {
			for (const { seam, rows, summary } of some) {
				for (const row of rows) quiet(tx.objectStore('entries').put(row));
				const { fold } = summary;
				quiet(tx.objectStore('summaries').put({ build, seam, fold, summary }));
			}
		});
		// A turn for the page, to say how far it is, and for the transaction, to ask for all of it.
		await new Promise((turn) => setTimeout(turn, 0));
	}
	await written;
	onprogress?.({ seams: seams.length, of: seams.length });
	const rows = rowsOf(ofTheBuild);
	await store.handle.run(async (db) => {
		const tx = writing(db, ['builds', 'entries', 'meta'], 'strict');
		await settled(tx, async () => {
			for (const row of rows) quiet(tx.objectStore('entries').put(row));
			// A tab without Web Locks may have cleared them meanwhile.
			const there = await tx.objectStore('entries').count(within(build));
			if (there !== entries.length) throw new DeviceError('device.store_lost');
			const maxN = entries.reduce((most, { n }) => Math.max(most, n), 0);
			quiet(tx.objectStore('meta').put({ is: 'made', maxN }, `made:${build}`));
			quiet(tx.objectStore('meta').put({ is: 'crew', crew }, `crew:${build}`));
			quiet(
				tx.objectStore('builds').put({
					...newBuildRow(build, name),
					role: crew.find(({ person }) => person === store.person)?.role ?? null,
					maxN,
					lines: entries.length,
					// Never a number at which another tab keeps lines of the one made before.
					changes: store.env.now()
				})
			);
		});
	});
	store.cache.forget(build);
	store.notices.send({ build, parts: ['', ...parts.keys()] });
}

async function inOne(
	store: DeviceStore,
	stores: StoreName[],
	durability: 'strict' | 'relaxed',
	ask: (tx: ReturnType<typeof writing>) => void
): Promise<void> {
	await store.handle.run(async (db) => {
		const tx = writing(db, stores, durability);
		await settled(tx, () => {
			ask(tx);
			return Promise.resolve();
		});
	});
}

function lineOf(entry: Entry): Line {
	return { id: entry.id, envelope: entry, entry };
}

function rowsOf(entries: readonly Entry[]) {
	return entries.map((entry) => {
		const text = canonicalText(tidy(entry));
		return placeless({ entry, text, hash: hashText(text) });
	});
}
