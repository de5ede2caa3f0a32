/** What goes out: which lines are due, in which batches, under which seals and proofs. */
import { utf8 } from '$lib/logbook/bytes';
import { makeSeal, type Seal } from '$lib/logbook/seal';
import { MOST_PUSHED, MOST_PUSHED_BYTES, type Proof } from '$lib/logbook/wire';
import { entriesOf } from './many';
import {
	within,
	type EntryRow,
	type FormerRow,
	type OutboxRow,
	type OutboxState,
	type SealRow
} from './schema';
import type { DeviceStore } from './store';

/** Asked again from time to time, so that what the owner decided arrives; and what the server choked on. */
const ASKED_AGAIN: readonly OutboxState[] = ['held', 'pending', 'refused', 'parked'];
/** A due time further off was set by a clock that was wrong. */
const FURTHEST = 2 * 3_600_000;
/** Left for the frame of the request: names, cursor, the own seal over 200 hashes. */
const FRAME = 24 * 1024;
/** A seal or proof a batch needs, in bytes of JSON: a hash with its quotes, the signature and the names. */
const BYTES_PER_HASH = 47;
const BYTES_PER_SEAL = 200;
const BYTES_PER_PROOF_ROW = 64;
const MOST_PROOFS = 20;

export type Key = Pick<OutboxRow, 'build' | 'n' | 'id'> & { readonly parked: boolean };

/** Is this row's time come? A clock that was set back must not hold a line for years. */
function isDue(row: Pick<OutboxRow, 'due'>, now: number): boolean {
	return row.due === undefined || row.due <= now || row.due > now + FURTHEST;
}

/** The rows to be offered now, in order of n; with `all` also those whose time has not come. */
export async function dueRows(
	store: DeviceStore,
	build: string,
	states: 'waiting' | 'all states',
	all: boolean
): Promise<Key[]> {
	const now = store.env.now();
	const wanted =
		states === 'waiting' ? (['waiting'] as const) : (['waiting', ...ASKED_AGAIN] as const);
	const rows = await store.handle.run(async (db) => {
		const index = db.transaction('outbox').store.index('byState');
		const found = await Promise.all(wanted.map((state) => index.getAll(within(build, state))));
		return found.flat();
	});
	return rows
		.filter((row) => !row.replaced && (all || isDue(row, now)))
		.sort((a, b) => a.n - b.n || (a.id < b.id ? -1 : 1))
		.map(({ n, id, state }) => ({ build, n, id, parked: state === 'parked' }));
}

/** When the next row of a build is due, in ms since 1970; undefined when none has a time. */
export async function nextDue(store: DeviceStore, build: string): Promise<number | undefined> {
	const now = store.env.now();
	const rows = await store.handle.run(async (db) => {
		const index = db.transaction('outbox').store.index('byState');
		const found = await Promise.all(
			(['waiting', ...ASKED_AGAIN] as const).map((state) => index.getAll(within(build, state)))
		);
		return found.flat();
	});
	let next: number | undefined;
	for (const row of rows) {
		if (row.replaced) continue;
		const due = isDue(row, now) ? now : (row.due ?? now);
		if (next === undefined || due < next) next = due;
	}
	return next;
}

/** A batch as it goes into a push. */
export interface Batch {
	readonly rows: readonly EntryRow[];
	readonly seals: readonly Seal[];
	readonly proofs: readonly Proof[];
	/** How many of the keys it was made of it took, with those that had gone meanwhile. */
	readonly taken: number;
}

/**
 * The next batch: as many of `keys`, from the first on, as fit into one push with what they need. Lines of this store
 * go out under a new seal of their device; carried ones under the stored seal that came with them; lines of a former
 * history with the proof that they stood in it.
 */
export async function makeBatch(
	store: DeviceStore,
	build: string,
	keys: readonly Pick<Key, 'id'>[],
	most: number,
	former?: FormerHistory
): Promise<Batch> {
	const wanted = keys.slice(0, Math.min(most, MOST_PUSHED));
	const { entries, seals } = await store.handle.run(async (db) => {
		const tx = db.transaction(['entries', 'seals'], 'readonly');
		const ids = wanted.map(({ id }) => id);
		const found = await entriesOf(tx.objectStore('entries'), build, ids);
		const names = new Set(found.flatMap((row) => (row?.seal === undefined ? [] : [row.seal])));
		const stored = await Promise.all(
			[...names].map(async (name) => tx.objectStore('seals').get([build, name]))
		);
		await tx.done;
		return { entries: found, seals: new Map(stored.flatMap((s) => (s ? [[s.name, s]] : []))) };
	});

	const rows: EntryRow[] = [];
	const own = new Map<string, string[]>();
	const carried = new Map<string, SealRow>();
	const proofs = new Map<string, FormerRow>();
	let bytes = FRAME;
	let taken = 0;
	for (const row of entries) {
		// A withdrawn line has no text left to offer; only its envelope survives.
		if (!row || row.withdrawn) {
			taken++;
			continue;
		}
		const keysOfDevice = await store.keysOf(row.device);
		const seal = row.seal === undefined ? undefined : seals.get(row.seal);
		const proof = former?.proofOf(row.id);
		const newSeal = !keysOfDevice && seal && !carried.has(seal.name) ? seal : undefined;
		const newProof = proof && !proofs.has(proof.name) ? proof : undefined;
		const cost =
			utf8(JSON.stringify(row.text)).length +
			1 +
			(newSeal ? newSeal.hashes.length * BYTES_PER_HASH + BYTES_PER_SEAL : 0) +
			(newProof ? newProof.segment.rows.length * BYTES_PER_PROOF_ROW + BYTES_PER_SEAL : 0);
		const full = bytes + cost > MOST_PUSHED_BYTES || (newProof && proofs.size >= MOST_PROOFS);
		// One line always goes, however large: the server says what is wrong with it.
		if (full && rows.length > 0) break;
		bytes += cost;
		taken++;
		rows.push(row);
		if (keysOfDevice) {
			const hashes = own.get(row.device);
			if (hashes) hashes.push(row.hash);
			else own.set(row.device, [row.hash]);
		} else if (seal) carried.set(seal.name, seal);
		if (proof) proofs.set(proof.name, proof.segment);
	}
	return {
		rows,
		taken,
		seals: [
			...(await sealOwn(store, build, own)),
			...[...carried.values()].map(({ device, hashes, signature }) => ({
				device,
				hashes,
				signature
			}))
		],
		proofs: [...proofs.values()].map(({ from, link, rows: proven, signature }) => ({
			after: { seq: from, link },
			rows: proven.map(([received, hash]): [number, string] => [received, hash]),
			signature
		}))
	};
}

/** One seal for each device of this store over these of its lines. Signing is awaited, so never in a transaction. */
export async function sealOwn(
	store: DeviceStore,
	build: string,
	own: ReadonlyMap<string, readonly string[]>
): Promise<Seal[]> {
	const seals: Seal[] = [];
	for (const [device, hashes] of own) {
		const keys = await store.keysOf(device);
		if (keys) seals.push(await makeSeal(keys.pair.privateKey, build, device, hashes));
	}
	return seals;
}

/** The histories a server no longer has, as proof that lines stood in them. */
export class FormerHistory {
	readonly #byId = new Map<string, { readonly name: string; readonly segment: FormerRow }>();

	private constructor(segments: readonly FormerRow[]) {
		// Ascending, so that of several histories the latest proves.
		for (const segment of segments) {
			if (segment.signature === '') continue;
			const proof = { name: `${segment.history} ${segment.from}`, segment };
			for (const [, , id] of segment.rows) this.#byId.set(id, proof);
		}
	}

	static async read(store: DeviceStore, build: string): Promise<FormerHistory> {
		return new FormerHistory(await store.handle.run((db) => db.getAll('former', within(build))));
	}

	proofOf(id: string) {
		return this.#byId.get(id);
	}
}

/** Lines here that have no place in the server's history and are not on their way there by the outbox, by n. */
export async function unplacedRows(
	store: DeviceStore,
	build: string
): Promise<Pick<EntryRow, 'build' | 'n' | 'id'>[]> {
	return store.handle.run(async (db) => {
		const tx = db.transaction(['builds', 'entries', 'outbox'], 'readonly');
		const row = await tx.objectStore('builds').get(build);
		if (!row || row.lines === row.cursor.seq) return [];
		const onTheWay = new Set(
			(await tx.objectStore('outbox').getAll(within(build)))
				.filter(({ replaced }) => !replaced)
				.map(({ id }) => id)
		);
		const found: Pick<EntryRow, 'build' | 'n' | 'id'>[] = [];
		for (const entry of await tx.objectStore('entries').index('byN').getAll(within(build))) {
			const placed = entry.history === row.history && entry.seq !== undefined;
			// Withdrawn ones have no text to offer, unreadable ones no id the server could be asked for.
			if (placed || onTheWay.has(entry.id) || entry.withdrawn || entry.id.startsWith('?')) continue;
			found.push({ build, n: entry.n, id: entry.id });
		}
		await tx.done;
		return found;
	});
}
