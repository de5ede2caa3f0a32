/**
 * Many rows at once. A request for each costs a browser several times what one request over all of them does, and the
 * lines of an evening lie side by side.
 */
import type { IDBPObjectStore } from 'idb';
import type { EntryRow, OutboxRow, Schema, StoreName } from './schema';
import { quiet } from './handle';

type Reader<Name extends StoreName> = Pick<
	IDBPObjectStore<Schema, StoreName[], Name, IDBTransactionMode>,
	'get' | 'getAll'
>;
type Key = Pick<OutboxRow, 'n' | 'id'>;

/** Rows that lie between the wanted ones are read along, at most so many for each. Beyond it, each is asked for. */
const STRAY = 2;

/** The lines of these ids, in their order; undefined where none is here. */
export async function entriesOf(
	entries: Reader<'entries'>,
	build: string,
	ids: readonly string[]
): Promise<(EntryRow | undefined)[]> {
	if (ids.length === 0) return [];
	const sorted = [...ids].sort();
	const limit = ids.length * (1 + STRAY);
	const range = IDBKeyRange.bound([build, sorted[0]], [build, sorted.at(-1)]);
	const found = await entries.getAll(range, limit);
	const byId = new Map(found.map((row) => [row.id, row]));
	if (found.length < limit) return ids.map((id) => byId.get(id));
	return Promise.all(ids.map(async (id) => byId.get(id) ?? entries.get([build, id])));
}

/** The outbox rows of these lines, in their order; undefined where there is none. */
export async function outboxRowsOf(
	outbox: Reader<'outbox'>,
	build: string,
	keys: readonly Key[]
): Promise<(OutboxRow | undefined)[]> {
	const range = rangeOf(build, keys);
	if (!range) return [];
	const limit = keys.length * (1 + STRAY);
	const found = await outbox.getAll(range, limit);
	const byKey = new Map(found.map((row) => [nameOf(row), row]));
	if (found.length < limit) return keys.map((key) => byKey.get(nameOf(key)));
	return Promise.all(
		keys.map(async (key) => byKey.get(nameOf(key)) ?? outbox.get([build, key.n, key.id]))
	);
}

/** Ends the outbox rows of these lines: with one request where no other row lies between them. */
export async function endOutboxRows(
	outbox: IDBPObjectStore<Schema, StoreName[], 'outbox', 'readwrite'>,
	build: string,
	keys: readonly Key[]
): Promise<void> {
	const range = rangeOf(build, keys);
	if (!range) return;
	const ended = new Set(keys.map(nameOf));
	const there = await outbox.getAllKeys(range, keys.length + 1);
	if (there.every(([, n, id]) => ended.has(nameOf({ n, id })))) {
		quiet(outbox.delete(range));
		return;
	}
	for (const { n, id } of keys) quiet(outbox.delete([build, n, id]));
}

const nameOf = ({ n, id }: Key) => `${n} ${id}`;

function rangeOf(build: string, keys: readonly Key[]): IDBKeyRange | undefined {
	const [first] = keys;
	if (!first) return undefined;
	let [least, most] = [first.n, first.n];
	for (const { n } of keys) {
		least = Math.min(least, n);
		most = Math.max(most, n);
	}
	return IDBKeyRange.bound([build, least], [build, most, []]);
}
