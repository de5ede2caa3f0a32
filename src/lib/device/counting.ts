/** Inside a write transaction: what touched seams amount to now, kept in step with the lines. */
import { foldSeam } from '$lib/logbook/fold/seam';
import { summarise } from '$lib/logbook/fold/summary';
import type { Line } from '$lib/logbook/fold/line';
import { nameOf } from './errors';
import { quiet } from './handle';
import { countedLines } from './lines';
import { within, type Database, type StoreName, type Transaction } from './schema';

export type Writing = Transaction<StoreName, 'readwrite'>;

/** A write transaction over exactly these stores. `strict`: what it wrote is on the disk when it is done. */
export function writing(db: Database, stores: StoreName[], durability: 'strict' | 'relaxed') {
	return db.transaction(stores, 'readwrite', { durability });
}

/** What a transaction adds to a part whose lines are known; nothing else may have changed there. */
export interface Change {
	readonly before: readonly Line[];
	readonly added: readonly Line[];
}

/**
 * Writes the summaries of the seams among `parts`. A part without a known change is read anew, so its rows must be
 * asked to be written before.
 * @returns the lines of each part, for the cache once the transaction is committed
 */
export async function recount(
	tx: Writing,
	build: string,
	parts: ReadonlyMap<string, Change | undefined>
): Promise<Map<string, Line[] | undefined>> {
	const after = new Map<string, Line[] | undefined>();
	for (const [part, change] of parts) {
		const lines = change ? [...change.before, ...change.added] : await readPart(tx, build, part);
		after.set(part, lines);
		if (part !== '') putSummary(tx, build, part, lines);
	}
	return after;
}

async function readPart(tx: Writing, build: string, part: string): Promise<Line[]> {
	return countedLines(await tx.objectStore('entries').index('byPart').getAll(within(build, part)));
}

function putSummary(tx: Writing, build: string, seam: string, lines: readonly Line[]): void {
	const summary = summarise(foldSeam(seam, lines));
	quiet(tx.objectStore('summaries').put({ build, seam, fold: summary.fold, summary }));
}

/**
 * Ends a transaction whose requests were not awaited one by one. Undoes everything when `work` throws.
 * @throws what `work` threw, or why the transaction failed
 */
export async function settled<T>(tx: Writing, work: () => Promise<T>): Promise<T> {
	// Heard from the start: a transaction may fail while `work` still waits for one of its requests.
	const done = tx.done.then(
		() => undefined,
		(error: unknown) => ({ error })
	);
	let result: T;
	try {
		result = await work();
		commit(tx);
	} catch (error) {
		try {
			tx.abort();
		} catch {
			// It had ended by itself; why is told by `done`.
		}
		const failed = await done;
		// Requests of a failed transaction only say that it failed; the transaction knows why. "Aborted" is this function.
		if (failed && nameOf(failed.error) !== 'AbortError') throw failed.error;
		throw error;
	}
	const failed = await done;
	if (failed) throw failed.error;
	return result;
}

/** Everything was asked for: the browser need not wait until it has told of each request that there is no other. */
function commit(tx: Writing): void {
	try {
		tx.commit();
	} catch {
		// It ended by itself, or failed; `done` knows.
	}
}
