import { AsyncLocalStorage } from 'node:async_hooks';
import { setTimeout as sleep } from 'node:timers/promises';
import type { Db, Trx } from './db';

const ATTEMPTS = 6;

/** The disk is full: nothing of the transaction was kept. */
export class DiskFullError extends Error {
	override name = 'DiskFullError';
}

const queues = new WeakMap<Db, Promise<unknown>>();
const inside = new AsyncLocalStorage<true>();

/**
 * Runs `work` as one write transaction, after every write asked for before it: sequence numbers,
 * links and Lamport counters are read and raised inside, and two interleaved writers would give one
 * twice. When it returns, the transaction is committed and on the disk.
 *
 * `work` may run more than once (another process held the lock), so it does nothing but query
 * through `trx`: no mail, no files, no event before the commit. Hash and read beforehand.
 * Throws what `work` throws, after rolling back; DiskFullError when the disk is full.
 */
export function write<T>(db: Db, work: (trx: Trx) => Promise<T>): Promise<T> {
	if (inside.getStore() === true) {
		return Promise.reject(new Error('write() inside write() would wait for itself: pass trx down'));
	}
	const turn = (queues.get(db) ?? Promise.resolve()).then(() => attempt(db, work));
	// The next in line comes after this one, whether it succeeds or fails.
	queues.set(
		db,
		turn.catch(() => undefined)
	);
	return turn;
}

async function attempt<T>(db: Db, work: (trx: Trx) => Promise<T>): Promise<T> {
	for (let left = ATTEMPTS - 1; ; left--) {
		try {
			return await db.transaction().execute((trx) => inside.run(true, () => work(trx)));
		} catch (error) {
			const code = sqliteCode(error);
			if (code.startsWith('SQLITE_BUSY') && left > 0) {
				await sleep(10 * 2 ** (ATTEMPTS - left));
				continue;
			}
			// The second is a full disk met while growing the shared-memory file.
			if (code === 'SQLITE_FULL' || code === 'SQLITE_IOERR_SHMSIZE') {
				throw new DiskFullError('the disk of the server is full', { cause: error });
			}
			throw error;
		}
	}
}

function sqliteCode(error: unknown): string {
	if (!(error instanceof Error) || !('code' in error)) return '';
	return typeof error.code === 'string' ? error.code : '';
}
