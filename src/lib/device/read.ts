/** Reading the store. Every screen is a fold of what these return; none of them needs a network. */
import type { Line } from '$lib/logbook/fold/line';
import { foldBuild, type Build } from '$lib/logbook/fold/build';
import { foldSeam, FOLD_VERSION, type Seam } from '$lib/logbook/fold/seam';
import type { SeamSummary } from '$lib/logbook/fold/summary';
import type { Seal } from '$lib/logbook/seal';
import type { CrewMember } from '$lib/logbook/wire';
import { countedLines, lineOfRow } from './lines';
import { recount, settled, writing } from './counting';
import {
	within,
	type BuildRow,
	type EntryRow,
	type LineFinding,
	type OutboxRow,
	type OutboxState
} from './schema';
import type { DeviceStore } from './store';

/** What lists show of a build. */
export type BuildListing = Readonly<
	Pick<
		BuildRow,
		| 'build'
		| 'name'
		| 'role'
		| 'removed'
		| 'known'
		| 'head'
		| 'lines'
		| 'lastSuccess'
		| 'quarantined'
	>
> & { readonly cursor: number };

/** The builds on this device, by name. */
export async function builds(store: DeviceStore): Promise<BuildListing[]> {
	const rows = await store.handle.run((db) => db.getAll('builds'));
	return rows
		.map(listing)
		.sort((a, b) => a.name.localeCompare(b.name) || (a.build < b.build ? -1 : 1));
}

/** One build, or undefined when it is not on this device. */
export async function buildHere(
	store: DeviceStore,
	build: string
): Promise<BuildListing | undefined> {
	const row = await store.handle.run((db) => db.get('builds', build));
	return row && listing(row);
}

function listing(row: BuildRow): BuildListing {
	const { build, name, role, removed, known, head, lines, lastSuccess, quarantined } = row;
	return {
		build,
		name,
		role,
		removed,
		known,
		head,
		lines,
		cursor: row.cursor.seq,
		...(lastSuccess !== undefined && { lastSuccess }),
		...(quarantined !== undefined && { quarantined })
	};
}

/** The counted lines of a seam, or with '' those that concern none. Refused, pending and discarded ones are left out. */
export async function linesOfPart(
	store: DeviceStore,
	build: string,
	part: string
): Promise<readonly Line[]> {
	return store.handle.run(async (db) => {
		const tx = db.transaction(['builds', 'entries'], 'readonly');
		const row = await tx.objectStore('builds').get(build);
		if (!row) return [];
		const cached = store.cache.get(build, row.changes, part);
		const lines =
			cached ??
			countedLines(await tx.objectStore('entries').index('byPart').getAll(within(build, part)));
		await tx.done;
		if (!cached) store.cache.set(build, row.changes, row.changes, new Map([[part, lines]]));
		return lines;
	});
}

/** A seam as it stands. */
export async function foldedSeam(store: DeviceStore, build: string, seam: string): Promise<Seam> {
	return foldSeam(seam, await linesOfPart(store, build, seam));
}

/** The build as it stands: its plan, crew, devices and what is in use. */
export async function foldedBuild(store: DeviceStore, build: string): Promise<Build> {
	return foldBuild(await linesOfPart(store, build, ''));
}

/**
 * The summary of every seam of a build. Those made by another version of the fold are made again, each in a transaction
 * with the lines it sums.
 */
export async function summaries(store: DeviceStore, build: string): Promise<SeamSummary[]> {
	const rows = await store.handle.run((db) => db.getAll('summaries', within(build)));
	const fresh = rows.filter(({ fold }) => fold === FOLD_VERSION).map(({ summary }) => summary);
	if (fresh.length === rows.length) return fresh;
	for (const { fold, seam } of rows) {
		if (fold === FOLD_VERSION) continue;
		await store.handle.run(async (db) => {
			const tx = writing(db, ['entries', 'summaries'], 'relaxed');
			await settled(tx, () => recount(tx, build, new Map([[seam, undefined]])));
		});
	}
	const again = await store.handle.run((db) => db.getAll('summaries', within(build)));
	return again.map(({ summary }) => summary);
}

/** A line with what the device knows of its way: for the logbook screen. */
export interface LoggedLine {
	readonly id: string;
	readonly line: Line | undefined;
	readonly text: string;
	readonly hash: string;
	/** Its number in the server's log, once this device has seen it there. */
	readonly seq?: number;
	readonly received?: number;
	/** It is never sent: it lies in a store that stays. */
	readonly stays?: true;
	/** Not counted: refused, pending or discarded. */
	readonly excluded: boolean;
	readonly finding?: LineFinding;
	readonly outbox?: OutboxRow;
	/** Ours under this id, where the log has another line: `text` is that one's. */
	readonly conflict?: { readonly text: string; readonly hash: string };
}

/** Where the next page of {@link newestLines} begins. */
export type After = { readonly n: number; readonly id: string };

/**
 * All lines of a build, struck and refused ones too, the highest number first.
 * @param after the last line of the page before
 */
export async function newestLines(
	store: DeviceStore,
	build: string,
	{ after, limit = 100 }: { readonly after?: After; readonly limit?: number } = {}
): Promise<LoggedLine[]> {
	return store.handle.run(async (db) => {
		const tx = db.transaction(['builds', 'entries', 'outbox'], 'readonly');
		const history = (await tx.objectStore('builds').get(build))?.history ?? 0;
		const upper: [string, number | never[]] = after ? [build, after.n] : [build, []];
		const range = IDBKeyRange.bound([build], upper);
		const rows: EntryRow[] = [];
		let cursor = await tx.objectStore('entries').index('byN').openCursor(range, 'prev');
		while (cursor && rows.length < limit) {
			const row = cursor.value;
			if (!after || row.n < after.n || row.id < after.id) rows.push(row);
			cursor = await cursor.continue();
		}
		const outbox = await Promise.all(
			rows.map(async (row) =>
				row.history === history && row.seq !== undefined
					? undefined
					: tx.objectStore('outbox').get([build, row.n, row.id])
			)
		);
		await tx.done;
		return rows.map((row, i) => logged(store, row, history, outbox[i]));
	});
}

function logged(
	{ stays }: DeviceStore,
	row: EntryRow,
	history: number,
	outbox: OutboxRow | undefined
): LoggedLine {
	const { id, text, hash, seq, received, finding, conflict } = row;
	return {
		id,
		line: lineOfRow(row),
		text,
		hash,
		...(row.history === history && seq !== undefined && { seq }),
		...(row.history === history && received !== undefined && { received }),
		...(stays && { stays }),
		excluded: row.excluded === 1,
		...(finding && { finding }),
		...(outbox && { outbox }),
		...(conflict && { conflict })
	};
}

/** One line with the seal that covers it, where one is stored. */
export async function oneLine(
	store: DeviceStore,
	build: string,
	id: string
): Promise<(LoggedLine & { readonly seal?: Seal }) | undefined> {
	return store.handle.run(async (db) => {
		const tx = db.transaction(['builds', 'entries', 'outbox', 'seals'], 'readonly');
		const row = await tx.objectStore('entries').get([build, id]);
		if (!row) return undefined;
		const history = (await tx.objectStore('builds').get(build))?.history ?? 0;
		const outbox = await tx.objectStore('outbox').get([build, row.n, id]);
		const seal =
			row.seal === undefined ? undefined : await tx.objectStore('seals').get([build, row.seal]);
		await tx.done;
		return {
			...logged(store, row, history, outbox),
			...(seal && {
				seal: { device: seal.device, hashes: seal.hashes, signature: seal.signature }
			})
		};
	});
}

/** Lines the device itself has something to say about: a broken seal, a second key, two contents of one id. */
export async function linesWithFindings(store: DeviceStore, build: string): Promise<LoggedLine[]> {
	return store.handle.run(async (db) => {
		const tx = db.transaction(['builds', 'entries'], 'readonly');
		const history = (await tx.objectStore('builds').get(build))?.history ?? 0;
		const rows = await tx.objectStore('entries').getAll(within(build));
		await tx.done;
		return rows
			.filter(({ finding }) => finding)
			.map((row) => logged(store, row, history, undefined));
	});
}

export type OutboxCounts = Record<OutboxState, number>;

/** How many lines of a build are in which state on their way to the server. */
export async function outboxCounts(store: DeviceStore, build: string): Promise<OutboxCounts> {
	const states: OutboxState[] = [
		'waiting',
		'acknowledged',
		'held',
		'pending',
		'refused',
		'discarded',
		'parked'
	];
	return store.handle.run(async (db) => {
		const index = db.transaction('outbox').store.index('byState');
		const counts = await Promise.all(states.map((state) => index.count(within(build, state))));
		return Object.fromEntries(
			states.map((state, i) => [state, counts[i] as number])
		) as OutboxCounts;
	});
}

/** The lines of a build on their way, in order of their number. */
export async function outboxRows(
	store: DeviceStore,
	build: string,
	states?: readonly OutboxState[]
): Promise<OutboxRow[]> {
	const rows = await store.handle.run((db) => db.getAll('outbox', within(build)));
	return states ? rows.filter(({ state }) => states.includes(state)) : rows;
}

/** The crew of a build as the server last told it, with names. Empty before the first contact. */
export async function crewOf(store: DeviceStore, build: string): Promise<readonly CrewMember[]> {
	const meta = await store.handle.run((db) => db.get('meta', `crew:${build}`));
	return meta?.is === 'crew' ? meta.crew : [];
}

/** What is typed into a form and not yet a line: it survives the tab. `key` names the form. */
export async function saveDraft(store: DeviceStore, key: string, value: unknown): Promise<void> {
	await store.handle.run((db) => db.put('drafts', { key, json: JSON.stringify(value) }));
}

/** The saved draft as unknown JSON; the form checks it. Undefined when there is none. */
export async function loadDraft(store: DeviceStore, key: string): Promise<unknown> {
	const row = await store.handle.run((db) => db.get('drafts', key));
	return row && (JSON.parse(row.json) as unknown);
}

export async function dropDraft(store: DeviceStore, key: string): Promise<void> {
	await store.handle.run((db) => db.delete('drafts', key));
}
