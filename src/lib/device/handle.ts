/**
 * A connection that is put right when it dies.
 *
 * Browsers cut connections: Safari those of tabs in the background, every browser those in the way of an upgrade or of
 * a page kept for "back". Trying again on the dead handle never helps; a new one, once, does.
 */
import { openDB, type DBSchema, type IDBPDatabase } from 'idb';
import { DeviceError, nameOf } from './errors';

/** Longer than any upgrade takes: another tab holds the old version and does not let go. */
const BLOCKED_FOR = 10_000;

export class Handle<S extends DBSchema> {
	#opening: Promise<IDBPDatabase<S>> | undefined;
	#stop: (() => void) | undefined;
	#disposed = false;

	constructor(
		readonly name: string,
		readonly version: number,
		readonly upgrade: (db: IDBPDatabase<S>, from: number) => void
	) {
		const target = (globalThis as { addEventListener?: typeof addEventListener }).addEventListener;
		if (typeof target !== 'function' || typeof document === 'undefined') return;
		// A page put aside with an open connection would block upgrades in others, or be thrown away.
		const onHide = (event: PageTransitionEvent) => {
			if (event.persisted) this.close();
		};
		addEventListener('pagehide', onHide);
		this.#stop = () => {
			removeEventListener('pagehide', onHide);
		};
	}

	/**
	 * Runs `work` with an open connection; on a dead one, once more with a new one. So `work` must bear being run
	 * twice: what it writes, it writes in one transaction.
	 * @throws DeviceError `device.full` when there is no room, `device.store_closed` when the store cannot be opened
	 */
	async run<T>(work: (db: IDBPDatabase<S>) => Promise<T>): Promise<T> {
		for (let again = false; ; again = true) {
			const opening = this.#open();
			const db = await opening;
			try {
				return await work(db);
			} catch (error) {
				if (nameOf(error) === 'QuotaExceededError')
					throw new DeviceError('device.full', { cause: error });
				if (again || !isDeadHandle(error)) throw error;
				this.#drop(opening);
				db.close();
			}
		}
	}

	/** Lets go of the connection; the next use opens it again. */
	close(): void {
		const opening = this.#opening;
		this.#opening = undefined;
		void opening?.then(
			(db) => {
				db.close();
			},
			() => undefined
		);
	}

	/** For good: a screen that is going away must not make a deleted store anew. */
	dispose(): void {
		this.#disposed = true;
		this.#stop?.();
		this.close();
	}

	#open(): Promise<IDBPDatabase<S>> {
		if (this.#disposed) return Promise.reject(new DeviceError('device.store_closed'));
		// Registered before anything is awaited: else each caller of the first moment opens one of its own.
		if (this.#opening) return this.#opening;
		const opening: Promise<IDBPDatabase<S>> = this.#connect(() => {
			this.#drop(opening);
		});
		this.#opening = opening;
		opening.catch(() => {
			this.#drop(opening);
		});
		return opening;
	}

	#drop(opening: Promise<IDBPDatabase<S>>): void {
		if (this.#opening === opening) this.#opening = undefined;
	}

	async #connect(onGone: () => void): Promise<IDBPDatabase<S>> {
		let timer: ReturnType<typeof setTimeout> | undefined;
		const stuck = new Promise<never>((_, reject) => {
			timer = setTimeout(() => {
				reject(
					new DeviceError('device.store_closed', { detail: 'the store did not open in time' })
				);
			}, BLOCKED_FOR);
		});
		const { upgrade } = this;
		const opened: { db?: IDBPDatabase<S> } = {};
		const callbacks = {
			blocking: () => {
				// Another tab wants to upgrade. What runs here ends first; the next use waits for the upgrade.
				opened.db?.close();
				onGone();
			},
			terminated: onGone
		};
		const open = async () => {
			try {
				opened.db = await openDB<S>(this.name, this.version, {
					...callbacks,
					upgrade: (db, from) => {
						upgrade(db, from);
					}
				});
			} catch (error) {
				// The app was rolled back: the store is newer than the code. It only ever grew, so it serves.
				if (nameOf(error) !== 'VersionError') throw error;
				opened.db = await openDB<S>(this.name, undefined, callbacks);
			}
			return opened.db;
		};
		const opening = open();
		try {
			return await Promise.race([opening, stuck]);
		} catch (error) {
			opening.then(
				(db) => {
					db.close();
				},
				() => undefined
			);
			if (error instanceof DeviceError) throw error;
			const full = nameOf(error) === 'QuotaExceededError';
			throw new DeviceError(full ? 'device.full' : 'device.store_closed', { cause: error });
		} finally {
			clearTimeout(timer);
		}
	}
}

function isDeadHandle(error: unknown): boolean {
	// InvalidStateError: closed. UnknownError: cut by the browser. AbortError: cut in the middle; nothing was kept.
	return ['InvalidStateError', 'UnknownError', 'AbortError'].includes(nameOf(error));
}

/** For a request whose failure the transaction reports. */
export function quiet(request: Promise<unknown>): void {
	request.catch(() => undefined);
}
