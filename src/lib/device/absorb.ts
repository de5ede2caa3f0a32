/** Storing what the server sent: pages of its history, and what it said of the lines it was offered. */
import { start, type Place } from '$lib/logbook/chain';
import { canonicalText, type Json } from '$lib/logbook/bytes';
import { N_LEAP } from '$lib/logbook/judge';
import { isRefusalCode, refusal } from '$lib/logbook/refusals';
import { PAGE, type CrewMember, type PushResult, type SignedPlace } from '$lib/logbook/wire';
import type { Line } from '$lib/logbook/fold/line';
import { highestTame, newBuildRow } from './append';
import { recount, settled, writing, type Change, type Writing } from './counting';
import { quiet } from './handle';
import { endOutboxRows, entriesOf, outboxRowsOf } from './many';
import {
	within,
	type BuildRow,
	type EntryRow,
	type FormerRow,
	type OutboxRow,
	type OutboxState
} from './schema';
import type { DeviceStore } from './store';
import type { Listed } from './transport';
import type { CheckedPage } from './verify';

const HOUR = 3_600_000;

function without<T extends object, K extends keyof T>(object: T, ...keys: K[]): Omit<T, K> {
	const copy = { ...object };
	for (const key of keys) Reflect.deleteProperty(copy, key);
	return copy;
}

/** How a committed change is told: the parts whose lines changed, and the cache brought up to date. */
interface Told {
	readonly before: number;
	readonly after: number;
	readonly lines: ReadonlyMap<string, Line[] | undefined>;
}

function tell(store: DeviceStore, build: string, { before, after, lines }: Told): void {
	if (after !== before) store.cache.set(build, before, after, lines);
	store.notices.send({ build, parts: [...lines.keys()] });
}

/**
 * Stores a checked page: its lines, their places and seals, the cursor behind them, the summaries of the seams they
 * touch, and ends the outbox rows of the lines that came back. One transaction: a cursor ahead of its lines would lose
 * them for ever.
 *
 * @returns false and nothing is stored when another tab has moved the cursor meanwhile
 */
export async function absorbPage(
	store: DeviceStore,
	build: string,
	page: CheckedPage
): Promise<boolean> {
	const told = await store.handle.run(async (db) => {
		const tx = writing(
			db,
			['builds', 'entries', 'outbox', 'seals', 'devices', 'summaries', 'waypoints'],
			'relaxed'
		);
		return settled(tx, async () => {
			const row = await tx.objectStore('builds').get(build);
			if (!row || row.cursor.seq !== page.from.seq || row.cursor.link !== page.from.link)
				return false;
			if (isKnown(row, page)) return true;
			const parts = await placeLines(store, tx, row, page);
			for (const seal of page.seals) quiet(tx.objectStore('seals').put(seal));
			for (const device of page.devices) quiet(tx.objectStore('devices').put(device));
			if (page.lines.length > 0 && page.next.signature !== '')
				await addWaypoint(tx, row, page.next);
			const before = row.changes;
			const lines = await recount(tx, build, parts.counted);
			for (const part of parts.touched) if (!lines.has(part)) lines.set(part, undefined);
			if (lines.size > 0) row.changes++;
			row.cursor = page.next;
			row.head = Math.max(page.head, page.next.seq);
			// The server's word, never the lines' own: one that counts wildly would take this device, and all it writes, along.
			row.maxN = Math.max(
				page.maxN,
				row.maxN > page.maxN + N_LEAP ? await highestTame(tx, build) : row.maxN
			);
			row.known = true;
			if (page.server !== undefined) row.server = page.server;
			quiet(tx.objectStore('builds').put(row));
			return { before, after: row.changes, lines };
		});
	});
	if (typeof told === 'boolean') return told;
	tell(store, build, told);
	return true;
}

/** Does the page say nothing new? A round that finds nothing writes nothing. */
function isKnown(row: BuildRow, page: CheckedPage): boolean {
	return (
		page.lines.length === 0 &&
		row.known &&
		row.head === page.head &&
		row.maxN >= page.maxN &&
		row.maxN <= page.maxN + N_LEAP &&
		row.server === page.server
	);
}

/** Puts the lines of a page in, beside or over what is here; says which parts have to be summed again and how. */
async function placeLines(
	store: DeviceStore,
	tx: Writing,
	row: BuildRow,
	page: CheckedPage
): Promise<{ counted: Map<string, Change | undefined>; touched: Set<string> }> {
	const { build } = row;
	const entries = tx.objectStore('entries');
	// Lines here that have no place in this history yet; only they can be among those that come.
	const unplaced = row.lines - row.cursor.seq;
	const there =
		unplaced > 0
			? await entriesOf(
					entries,
					build,
					page.lines.map(({ row: { id } }) => id)
				)
			: [];
	/** Lines that came back. */
	const ended: EntryRow[] = [];

	const added = new Map<string, Line[]>();
	/** Parts in which a line that was here already changed what it counts for. */
	const changed = new Set<string>();
	/** Lines of this device whose id another has in the log. */
	const replaced: EntryRow[] = [];
	page.lines.forEach(({ row: incoming, line }, i) => {
		const { part } = incoming;
		const here = there[i];
		if (!here) {
			row.lines++;
			quiet(entries.put(incoming));
			const list = added.get(part);
			if (list && line) list.push(line);
			else if (line) added.set(part, [line]);
			else changed.add(part);
			return;
		}
		if (here.hash === incoming.hash) {
			if (here.excluded || incoming.withdrawn) changed.add(part);
			const { conflict } = here;
			if (conflict) {
				// Pulled once more after a restore: what was ours under this id is nowhere else.
				const finding = incoming.finding ?? 'entry.id_conflict';
				quiet(entries.put({ ...incoming, finding, conflict }));
				return;
			}
			quiet(entries.put(incoming));
			ended.push(here);
			return;
		}
		// Another line has this id on the server: that one is in the log. Ours stays, visible and not counted.
		changed.add(part).add(here.part);
		if (here.conflict?.hash === incoming.hash) {
			// After a restore ours was the first there.
			quiet(entries.put(incoming));
			const { n } = JSON.parse(here.conflict.text) as { n: number };
			quiet(tx.objectStore('outbox').delete([build, n, here.id]));
			return;
		}
		const conflict = here.conflict ?? { text: here.text, hash: here.hash };
		quiet(entries.put({ ...incoming, finding: incoming.finding ?? 'entry.id_conflict', conflict }));
		if (!here.conflict) replaced.push(here);
	});
	const outbox = tx.objectStore('outbox');
	await endOutboxRows(outbox, build, ended);
	for (const { n, id } of replaced) {
		const there = (await outbox.get([build, n, id])) ?? rowFor({ build, n, id }, store.env.now());
		const kept = without(there, 'due');
		quiet(outbox.put({ ...kept, state: 'refused', code: 'entry.id_conflict', replaced: true }));
	}
	for (const { line } of page.lines) {
		if (line?.entry?.kind !== 'entry.withdrawn') continue;
		const part = await forget(tx, build, line.entry.body.entry, line.id);
		if (part !== undefined) changed.add(part);
	}

	const counted = new Map<string, Change | undefined>();
	for (const [part, lines] of added) {
		const before =
			page.from.seq === 0 && unplaced === 0 ? [] : store.cache.get(build, row.changes, part);
		if (changed.has(part)) continue;
		if (before) counted.set(part, { before, added: lines });
		else if (part !== '') counted.set(part, undefined);
	}
	for (const part of changed) if (part !== '') counted.set(part, undefined);
	return { counted, touched: new Set([...added.keys(), ...changed]) };
}

/** A body was withdrawn: its text goes, what remains is the envelope, the hash and the mark. */
async function forget(
	tx: Writing,
	build: string,
	id: string,
	by: string
): Promise<string | undefined> {
	const row = await tx.objectStore('entries').get([build, id]);
	if (!row) return undefined;
	if (row.withdrawn) {
		if (!row.conflict) quiet(tx.objectStore('outbox').delete([build, row.n, id]));
		return undefined;
	}
	const envelope = without(JSON.parse(row.text) as Record<string, Json>, 'body');
	const kept = without(row, 'sound');
	// Without its text it can never be offered: a row left in the outbox would be due for ever.
	if (!row.conflict) quiet(tx.objectStore('outbox').delete([build, row.n, id]));
	quiet(
		tx.objectStore('entries').put({
			...kept,
			text: '',
			withdrawn: { envelope: canonicalText(envelope), by }
		})
	);
	return row.part;
}

/** Keeps signed places so far apart that the lines between two fit into one proof, and no closer than that needs. */
async function addWaypoint(tx: Writing, row: BuildRow, place: SignedPlace): Promise<void> {
	const store = tx.objectStore('waypoints');
	const range = IDBKeyRange.bound([row.build, row.history], [row.build, row.history, []]);
	let cursor = await store.openCursor(range, 'prev');
	const last = cursor?.value.seq;
	cursor = (await cursor?.continue()) ?? null;
	const beforeLast = cursor?.value.seq ?? 0;
	if (last !== undefined && place.seq - beforeLast <= PAGE)
		quiet(store.delete([row.build, row.history, last]));
	quiet(store.put({ build: row.build, history: row.history, ...place }));
}

/** What the server said of a line it was offered. */
export interface Outcome {
	readonly row: Pick<OutboxRow, 'build' | 'n' | 'id'>;
	readonly result: PushResult;
}

/**
 * Takes over the results of a push, each line for itself: acknowledged, held, pending, refused, discarded, or to be
 * offered again later. Lines that are not (or again) counted change the summaries of their seams in the same
 * transaction. Lines offered again after the history changed, which have no outbox row, get one only if there is
 * something to be said of them.
 */
export async function absorbResults(
	store: DeviceStore,
	build: string,
	outcomes: readonly Outcome[],
	maxN: number
): Promise<void> {
	if (outcomes.length === 0) return;
	const now = store.env.now();
	const told = await store.handle.run(async (db) => {
		const tx = writing(db, ['builds', 'entries', 'outbox', 'summaries'], 'relaxed');
		return settled(tx, async () => {
			const row = await tx.objectStore('builds').get(build);
			if (!row) return undefined;
			const changed = new Map<string, undefined>();
			const outbox = tx.objectStore('outbox');
			const offers = outcomes.map((outcome) => outcome.row);
			const [waiting, entries] = await Promise.all([
				outboxRowsOf(outbox, build, offers),
				entriesOf(
					tx.objectStore('entries'),
					build,
					offers.map(({ id }) => id)
				)
			]);
			for (const [i, { row: offered, result }] of outcomes.entries()) {
				const [there, entry] = [waiting[i], entries[i]];
				// What was offered is the log's line; the row is of the one it replaced here.
				if (there?.replaced) continue;
				// Came back in a pull of another tab meanwhile: that is the last word.
				if (!entry || (entry.history === row.history && entry.seq !== undefined)) continue;
				const after = settle(there ?? rowFor(offered, now), result, now);
				// Offered again without a row: the pull that follows brings it, or it is offered once more.
				if (there || after.state !== 'acknowledged') quiet(outbox.put(after));
				if (setExcluded(tx, entry, isExcluded(after.state))) changed.set(entry.part, undefined);
			}
			const before = row.changes;
			const lines = await recount(tx, build, changed);
			if (lines.size > 0) row.changes++;
			row.maxN = Math.max(row.maxN, maxN);
			row.known = true;
			quiet(tx.objectStore('builds').put(row));
			return { before, after: row.changes, lines };
		});
	});
	if (told) tell(store, build, told);
}

/** A line that has a place meanwhile (another tab pulled it) has nothing to do in the outbox any more. */
async function isUnplaced(tx: Writing, build: string, id: string): Promise<boolean> {
	const row = await tx.objectStore('builds').get(build);
	const entry = await tx.objectStore('entries').get([build, id]);
	return !!row && !!entry && (entry.seq === undefined || entry.history !== row.history);
}

function rowFor(offered: Pick<OutboxRow, 'build' | 'n' | 'id'>, at: number): OutboxRow {
	const { build, n, id } = offered;
	return { build, n, id, state: 'waiting', tries: 0, at, carried: true };
}

const isExcluded = (state: OutboxState) =>
	state === 'refused' || state === 'pending' || state === 'discarded';

function setExcluded(tx: Writing, entry: EntryRow, excluded: boolean): boolean {
	if ((entry.excluded === 1) === excluded) return false;
	if (excluded) entry.excluded = 1;
	else delete entry.excluded;
	quiet(tx.objectStore('entries').put(entry));
	return true;
}

/** A line's next state after an offer. */
function settle(row: OutboxRow, { status, code }: PushResult, now: number): OutboxRow {
	const kept = without(row, 'code', 'due');
	const tries = row.tries + 1;
	const why = code !== undefined && { code };
	switch (status) {
		case 'accepted':
		case 'duplicate':
			return { ...kept, state: 'acknowledged', tries };
		case 'held':
			return { ...kept, ...why, state: 'held', tries, due: now + HOUR };
		case 'pending':
			return { ...kept, ...why, state: 'pending', tries, due: now + HOUR };
		case 'discarded':
			return { ...kept, state: 'discarded', code: code ?? 'entry.discarded', tries };
		case 'refused':
			return code !== undefined && isRefusalCode(code) && refusal(code).entry === 'later'
				? { ...kept, ...why, state: 'waiting', tries, due: now + backOff(tries) }
				: { ...kept, ...why, state: 'refused', tries, due: now + HOUR };
	}
}

/** Half a minute after the first time, doubling to an hour. */
function backOff(tries: number): number {
	return Math.min(HOUR, 30_000 * 2 ** Math.min(tries - 1, 10));
}

/** Parks lines on which the server fails although it takes others; they are tried again after an hour. */
export async function parkLine(
	store: DeviceStore,
	row: Pick<OutboxRow, 'build' | 'n' | 'id'>,
	code: string
): Promise<void> {
	await changeRows(
		store,
		row.build,
		[row],
		(there, now) => ({
			...there,
			state: 'parked',
			code,
			tries: there.tries + 1,
			due: now + HOUR
		}),
		true
	);
}

/** Counts a failed offer of a single line. @returns how often it has failed in a row */
export async function countFailure(
	store: DeviceStore,
	row: Pick<OutboxRow, 'build' | 'n' | 'id'>
): Promise<number> {
	let tries = 0;
	await changeRows(
		store,
		row.build,
		[row],
		(there) => ({
			...there,
			tries: (tries = there.tries + 1)
		}),
		true
	);
	return tries;
}

/**
 * Acknowledged lines that a later pull to the head did not bring back are not in the server's log after all (it was
 * restored to an earlier state): they wait again.
 */
export async function offerAgain(
	store: DeviceStore,
	build: string,
	rows: readonly Pick<OutboxRow, 'n' | 'id'>[]
): Promise<void> {
	if (rows.length === 0) return;
	const asked = new Set(rows.map(({ id }) => id));
	// Almost always none is left: one look instead of one for each.
	const left = await store.handle.run((db) =>
		db.getAllFromIndex('outbox', 'byState', within(build, 'acknowledged'))
	);
	await changeRows(
		store,
		build,
		left.filter(({ id }) => asked.has(id)),
		(there, now) =>
			there.state === 'acknowledged'
				? // The first time at once; a server that goes on saying yes and not keeping it is asked less and less.
					{
						...there,
						state: 'waiting',
						...(there.tries > 1 && { due: now + backOff(there.tries) })
					}
				: there
	);
}

/**
 * @param make a row where there is none: a line offered again after a restore has none, and one the server always fails
 *   on would never be put aside, and keep back all that comes after it
 */
async function changeRows(
	store: DeviceStore,
	build: string,
	rows: readonly Pick<OutboxRow, 'n' | 'id'>[],
	change: (there: OutboxRow, now: number) => OutboxRow,
	make = false
): Promise<void> {
	if (rows.length === 0) return;
	const now = store.env.now();
	await store.handle.run(async (db) => {
		const tx = writing(db, ['builds', 'entries', 'outbox'], 'relaxed');
		await settled(tx, async () => {
			for (const { n, id } of rows) {
				const there =
					(await tx.objectStore('outbox').get([build, n, id])) ??
					(make && (await isUnplaced(tx, build, id)) ? rowFor({ build, n, id }, now) : undefined);
				if (there && !there.replaced) quiet(tx.objectStore('outbox').put(change(there, now)));
			}
		});
	});
	store.notices.send({ build, parts: [] });
}

/**
 * The server's history is not the one this device followed. What was followed is kept as proof that it once was, the
 * cursor goes back to the start, and everything here is offered again as far as the server lacks it. Nothing that is
 * here is dropped.
 *
 * @param at the place the server did not know; nothing happens when the cursor has moved since
 */
export async function startOver(store: DeviceStore, build: string, at: Place): Promise<void> {
	await store.handle.run(async (db) => {
		const tx = writing(db, ['builds', 'entries', 'outbox', 'waypoints', 'former'], 'strict');
		await settled(tx, async () => {
			const row = await tx.objectStore('builds').get(build);
			if (!row || row.cursor.seq === 0) return;
			if (row.cursor.seq !== at.seq || row.cursor.link !== at.link) return;
			await keepFormer(tx, row);
			row.history++;
			row.cursor = { ...start(build), signature: '' };
			row.head = 0;
			row.reoffer = true;
			quiet(tx.objectStore('builds').put(row));
			for (const there of await tx.objectStore('outbox').getAll(within(build))) {
				// What it had on its disk it may have lost; what it refused it may have forgotten.
				const lost = there.state === 'acknowledged' || there.state === 'held';
				quiet(
					tx
						.objectStore('outbox')
						.put({ ...without(there, 'due'), ...(lost && { state: 'waiting' }) })
				);
			}
		});
	});
	store.notices.send({ build, parts: [] });
}

async function keepFormer(tx: Writing, row: BuildRow): Promise<void> {
	const { build, history } = row;
	const placed: EntryRow[] = [];
	for (const entry of await tx.objectStore('entries').getAll(within(build)))
		if (entry.history === history && entry.seq !== undefined) placed[entry.seq] = entry;
	let from: Place = start(build);
	for (const place of await tx.objectStore('waypoints').getAll(within(build, history))) {
		const rows = placed
			.slice(from.seq + 1, place.seq + 1)
			.filter((entry) => (entry as EntryRow | undefined) !== undefined)
			.map(({ received = 0, hash, id }): FormerRow['rows'][number] => [received, hash, id]);
		const { seq, link, signature } = place;
		quiet(
			tx
				.objectStore('former')
				.put({ build, history, from: from.seq, link: from.link, rows, signature })
		);
		quiet(tx.objectStore('waypoints').delete([build, history, seq]));
		from = { seq, link };
	}
}

/** Nothing lacks any more: the former history has served. */
export async function endReoffer(
	store: DeviceStore,
	build: string,
	history: number
): Promise<void> {
	await store.handle.run(async (db) => {
		const tx = writing(db, ['builds', 'former'], 'relaxed');
		await settled(tx, async () => {
			const row = await tx.objectStore('builds').get(build);
			if (row?.history !== history) return;
			quiet(tx.objectStore('builds').put({ ...row, reoffer: false }));
			quiet(tx.objectStore('former').delete(within(build)));
		});
	});
	store.notices.send({ build, parts: [] });
}

/** Takes over the list of builds. What it leaves out stays as it is: only "removed" means removed. */
export async function absorbList(store: DeviceStore, list: readonly Listed[]): Promise<void> {
	const changed = await store.handle.run(async (db) => {
		const tx = writing(db, ['builds'], 'relaxed');
		return settled(tx, async () => {
			const told: string[] = [];
			for (const listed of list) {
				const there = await tx.objectStore('builds').get(listed.build);
				if (!there && listed.removed) continue;
				const before = there ?? newBuildRow(listed.build, listed.name);
				const after: BuildRow = {
					...without(before, 'quarantined'),
					name: listed.name,
					role: listed.role,
					removed: listed.removed === true,
					known: true,
					...(!listed.removed && { head: Math.max(listed.head, before.cursor.seq) }),
					...(listed.quarantined !== undefined && { quarantined: listed.quarantined })
				};
				if (there && JSON.stringify(there) === JSON.stringify(after)) continue;
				quiet(tx.objectStore('builds').put(after));
				told.push(listed.build);
			}
			return told;
		});
	});
	for (const build of changed) store.notices.send({ build, parts: [] });
}

/** Sets what a round learnt about a build as a whole. */
export async function noteBuild(
	store: DeviceStore,
	build: string,
	fields: Partial<Pick<BuildRow, 'removed' | 'role' | 'lastSuccess' | 'head'>>
): Promise<void> {
	await store.handle.run(async (db) => {
		const tx = writing(db, ['builds'], 'relaxed');
		await settled(tx, async () => {
			const row = await tx.objectStore('builds').get(build);
			if (!row) return;
			const head = fields.head === undefined ? {} : { head: Math.max(row.head, fields.head) };
			quiet(tx.objectStore('builds').put({ ...row, ...fields, ...head }));
		});
	});
	store.notices.send({ build, parts: [] });
}

export async function keepCrew(
	store: DeviceStore,
	build: string,
	crew: readonly CrewMember[]
): Promise<void> {
	await store.handle.run((db) => db.put('meta', { is: 'crew', crew }, `crew:${build}`));
	store.notices.send({ build, parts: [''] });
}
