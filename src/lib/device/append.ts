/** Writing lines: the one way anything a person does enters the log. */
import {
	readEntry,
	writeEntry,
	partOf,
	type Entry,
	type Reading,
	type When
} from '$lib/logbook/entry';
import { lineOf, type Line } from '$lib/logbook/fold/line';
import type { Body, Kind } from '$lib/logbook/kinds';
import { start } from '$lib/logbook/chain';
import { N_LEAP } from '$lib/logbook/judge';
import { wallTime } from './clock';
import { recount, settled, writing, type Change, type Writing } from './counting';
import { DeviceError } from './errors';
import { quiet } from './handle';
import { within, type BuildRow, type Database, type EntryRow, type StoreName } from './schema';
import type { DeviceStore } from './store';

type DraftOf<K extends Kind> = K extends Kind
	? {
			/** Made up front with `store.newId()` where another draft refers to it. */
			readonly id?: string;
			readonly kind: K;
			readonly body: Body<K>;
			readonly seam?: string;
			readonly assembly?: string;
			/** The lines it stands on, in any order. */
			readonly on?: readonly string[];
			readonly when?: When;
		}
	: never;
/** What a screen says; the store adds who, when, on which device and the number. */
export type Draft<K extends Kind = Kind> = DraftOf<K>;

type Sound = Extract<Reading, { ok: true }>;

/** The highest number a line may have. */
const MOST_N = 2 ** 52;

const STORES: StoreName[] = ['builds', 'entries', 'outbox', 'summaries'];

/**
 * Adds lines to the log of a build and puts them in line for the server (but for a store that stays), all or none. When it returns they are on the
 * device's disk (one transaction of durability strict, committed). Their numbers follow each other from the highest
 * known that is no leap; the first lines of this device in a build are preceded by its `device.enrolled`. A `build.opened` as first
 * draft opens the build of its id.
 *
 * @returns the entries of the drafts, in their order
 * @throws DeviceError and nothing is saved: `device.full` without room, `device.store_closed` or `device.store_lost`
 *   when the browser does not keep it, `build.unknown` for a build not on this device, `build.removed` after leaving it,
 *   and the code of the first draft that is no valid line
 */
export async function appendEntries(
	store: DeviceStore,
	build: string,
	drafts: readonly Draft[]
): Promise<Entry[]> {
	if (drafts.length === 0) return [];
	// Ids are made once, so that a second try after a broken connection cannot write a line twice.
	const named = drafts.map((draft) => ({ ...draft, id: draft.id ?? store.newId() }));
	const enrolment = store.newId();
	const at = wallTime(store.env);
	const append = (db: Database) => appendOnce(store, db, build, named, enrolment, at);
	let written: Written;
	try {
		written = await store.handle.run(append);
	} catch (error) {
		// The first try may have been committed although its connection broke before saying so; whatever the second one
		// then failed with. "Nothing was saved" would have the work logged twice.
		const there = await readBack(store, build, named);
		if (there) {
			store.notices.send({ build, parts: [...new Set(there.map(partOf))], appended: true });
			return there;
		}
		if (error instanceof DeviceError) throw error;
		throw new DeviceError('device.store_lost', { cause: error });
	}
	store.cache.set(build, written.changes - 1, written.changes, written.lines);
	store.notices.send({ build, parts: written.parts, appended: true });
	if (!store.stays) void store.askToPersist();
	return written.entries;
}

interface Written {
	readonly entries: Entry[];
	readonly parts: string[];
	readonly changes: number;
	readonly lines: ReadonlyMap<string, Line[] | undefined>;
}

async function appendOnce(
	store: DeviceStore,
	db: Database,
	build: string,
	drafts: readonly (Draft & { id: string })[],
	enrolment: string,
	at: string
): Promise<Written> {
	const tx = writing(db, STORES, 'strict');
	return settled(tx, async () => {
		const { device, publicKey } = store.keys;
		const row = (await tx.objectStore('builds').get(build)) ?? openedBy(drafts, build);
		if (row.removed) throw new DeviceError('build.removed');

		const all: readonly (Draft & { id: string })[] = row.enrolled.includes(device)
			? drafts
			: withEnrolment(drafts, {
					id: enrolment,
					kind: 'device.enrolled',
					body: {
						key: publicKey,
						...(store.deviceName !== undefined && { name: store.deviceName })
					}
				});
		const entries = tx.objectStore('entries');
		const outbox = tx.objectStore('outbox');
		const added = new Map<string, Line[]>();
		const own: Entry[] = [];
		// A counter that ran away can number nothing any more: the lines go on from the highest that did not.
		if (row.maxN > MOST_N - all.length) row.maxN = await highestTame(tx, build);
		for (const draft of all) {
			const reading = written(draft, {
				build,
				n: await numberFor(tx, row, draft),
				device,
				author: store.person,
				at
			});
			const { entry } = reading;
			const part = partOf(entry);
			quiet(entries.add(placeless(reading)));
			if (!store.stays)
				quiet(
					outbox.add({
						build,
						n: entry.n,
						id: entry.id,
						state: 'waiting',
						tries: 0,
						at: store.env.now()
					})
				);
			const lines = added.get(part);
			const line = lineOf(reading) as Line;
			if (lines) lines.push(line);
			else added.set(part, [line]);
			if (entry.id !== enrolment) own.push(entry);
		}

		const parts = new Map<string, Change | undefined>();
		for (const [part, lines] of added) {
			const before = store.cache.get(build, row.changes, part);
			// The lines of the build itself are many and have no summary: they are read when a screen asks.
			if (before || part !== '') parts.set(part, before && { before, added: lines });
		}
		const lines = await recount(tx, build, parts);
		row.lines += all.length;
		row.changes++;
		if (all !== drafts) row.enrolled.push(device);
		quiet(tx.objectStore('builds').put(row));
		return { entries: own, parts: [...added.keys()], changes: row.changes, lines };
	});
}

/**
 * The next number. What stands on a line or strikes it comes after it, or is refused: so a line that stands on one
 * numbered wildly is numbered beyond that, but does not take the counter, and with it everybody, there.
 */
async function numberFor(tx: Writing, row: BuildRow, draft: Draft): Promise<number> {
	const named = new Set(draft.on);
	if ('entry' in draft.body && typeof draft.body.entry === 'string') named.add(draft.body.entry);
	let beyond = row.maxN;
	const entries = tx.objectStore('entries');
	for (const there of await Promise.all([...named].map((id) => entries.get([row.build, id]))))
		if (there && there.n > beyond) beyond = there.n;
	if (beyond <= row.maxN + N_LEAP) return (row.maxN = beyond + 1);
	// Nothing comes after the last number there is. Saved all the same; what to do about it the server says.
	return beyond < MOST_N ? beyond + 1 : ++row.maxN;
}

/** The highest number of a build's lines that is not a leap beyond those before it. */
export async function highestTame(tx: Writing, build: string): Promise<number> {
	let tame = 0;
	for (const { n } of await tx.objectStore('entries').index('byN').getAll(within(build))) {
		if (n > tame + N_LEAP) break;
		tame = n;
	}
	return tame;
}

/** A row for a build that begins with this line. */
function openedBy(drafts: readonly (Draft & { id: string })[], build: string): BuildRow {
	const first = drafts[0];
	if (first?.kind !== 'build.opened' || first.id !== build)
		throw new DeviceError('build.unknown', { detail: 'this build is not on this device' });
	// Whoever opens a build owns it; the server says the same when it hears of it.
	return { ...newBuildRow(build, first.body.name), role: 'owner' };
}

/** A build of which this device has no line yet. */
export function newBuildRow(build: string, name: string): BuildRow {
	return {
		build,
		name,
		role: null,
		history: 1,
		cursor: { ...start(build), signature: '' },
		maxN: 0,
		head: 0,
		lines: 0,
		changes: 0,
		enrolled: [],
		reoffer: false,
		removed: false,
		known: false
	};
}

/** The enrolment comes first; only the opening of the build itself comes before it. */
function withEnrolment(
	drafts: readonly (Draft & { id: string })[],
	enrolment: Draft<'device.enrolled'> & { id: string }
): (Draft & { id: string })[] {
	const first = drafts[0];
	return first?.kind === 'build.opened'
		? [first, enrolment, ...drafts.slice(1)]
		: [enrolment, ...drafts];
}

/** @throws DeviceError when the draft is no valid line */
function written(
	draft: Draft & { id: string },
	{ build, n, device, author, at }: Pick<Entry, 'build' | 'n' | 'device' | 'author' | 'at'>
): Sound {
	const { id, kind, body, seam, assembly, on, when } = draft;
	const reading = writeEntry({
		build,
		n,
		device,
		author,
		at,
		id,
		kind,
		v: 1,
		on: [...new Set(on)].sort(),
		body,
		...(seam !== undefined && { seam }),
		...(assembly !== undefined && { assembly }),
		...(when !== undefined && { when })
	} as Entry);
	if (reading.ok) return reading;
	throw new DeviceError(reading.code, {
		detail: 'detail' in reading ? `${kind}: ${reading.detail}` : kind
	});
}

/** The row of a sound line that has no place in the server's history yet. */
export function placeless({ entry, text, hash }: Omit<Sound, 'ok'>): EntryRow {
	return {
		build: entry.build,
		id: entry.id,
		part: partOf(entry),
		n: entry.n,
		kind: entry.kind,
		device: entry.device,
		author: entry.author,
		text,
		hash,
		sound: 1
	};
}

/** The entries of these drafts, if each of them is on the disk and says the same; undefined otherwise, also unread. */
async function readBack(
	store: DeviceStore,
	build: string,
	drafts: readonly (Draft & { readonly id: string })[]
): Promise<Entry[] | undefined> {
	try {
		const rows = await store.handle.run((db) =>
			Promise.all(drafts.map(({ id }) => db.get('entries', [build, id])))
		);
		const entries: Entry[] = [];
		for (const [i, row] of rows.entries()) {
			const reading = row && readEntry(row.text);
			if (!reading?.ok || reading.entry.author !== store.person) return undefined;
			// Written once more with the number, device and time it has there: other content under this id is not it.
			const again = written(drafts[i] as Draft & { id: string }, reading.entry);
			if (again.text !== row?.text) return undefined;
			entries.push(reading.entry);
		}
		return entries;
	} catch {
		return undefined;
	}
}
