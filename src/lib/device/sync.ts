/**
 * The sync of a store as screens know it, from the moment the store is open. What talks to the server is much code and
 * comes behind the page: a bench shows its seam and writes its lines without it.
 *
 * What must hold: while it is wanted it is tried again until it came. Chromium remembers a failed import for the life of
 * the page, so it is only imported where it is sure to come: out of the precache, or from a server that answers.
 */
import { askSession } from './session';
import type { Status, SyncLoop } from './loop';
import type { DeviceStore } from './store';
import type { Transport } from './transport';

/** As a loop begins that has not looked yet. */
const NOTHING_KNOWN: Status = {
	phase: 'idle',
	waiting: 0,
	held: 0,
	pending: 0,
	refused: 0,
	discarded: 0,
	parked: 0,
	acknowledgedNotBack: 0,
	offeredAgain: 0,
	synced: false,
	builds: []
};

/** What says how sync stands: {@link Sync}, or what stands in its place. */
export type SyncSource = Pick<Sync, 'status' | 'subscribe' | 'tryNow'>;

/** Of a store that stays: nothing is ever synced. */
export const NO_SYNC: SyncSource = {
	status: NOTHING_KNOWN,
	subscribe: () => () => undefined,
	tryNow: () => Promise.resolve()
};

const RETRY = 5000;

export class Sync {
	readonly #store: DeviceStore;
	readonly #transport: ((person: string) => Transport) | undefined;
	readonly #listeners = new Set<(status: Status) => void>();
	#status = NOTHING_KNOWN;
	#loop: SyncLoop | undefined;
	#loading: Promise<void> | undefined;
	#retry: ReturnType<typeof setTimeout> | undefined;
	#wanted = false;

	/** @param transport instead of the server over HTTP */
	constructor(store: DeviceStore, transport?: (person: string) => Transport) {
		this.#store = store;
		this.#transport = transport;
	}

	get status(): Status {
		return this.#status;
	}

	/** Hears of every new status. @returns the function that stops it */
	subscribe(listener: (status: Status) => void): () => void {
		this.#listeners.add(listener);
		return () => {
			this.#listeners.delete(listener);
		};
	}

	/** Begins; see {@link SyncLoop.start}. */
	start(): void {
		this.#wanted = true;
		if (this.#loop) this.#loop.start();
		else void this.#load();
	}

	/** Ends; see {@link SyncLoop.stop}. */
	stop(): void {
		this.#wanted = false;
		clearTimeout(this.#retry);
		this.#loop?.stop();
	}

	/** The button; see {@link SyncLoop.tryNow}. */
	async tryNow(): Promise<void> {
		await this.#load();
		await this.#loop?.tryNow();
	}

	/** Resolves also when it did not come. */
	#load(): Promise<void> {
		return (this.#loading ??= this.#bring().finally(() => {
			this.#loading = undefined;
		}));
	}

	async #bring(): Promise<void> {
		if (this.#loop) return;
		clearTimeout(this.#retry);
		try {
			if (!isKept() && (await askSession()) === 'unknown') throw new Error('no server answers');
			const { httpTransport, SyncLoop } = await import('./network');
			const { person } = this.#store;
			const loop = new SyncLoop(this.#store, (this.#transport ?? httpTransport)(person));
			loop.subscribe((status) => {
				this.#tell(status);
			});
			this.#loop = loop;
			if (this.#wanted) loop.start();
		} catch {
			this.#tell({ ...NOTHING_KNOWN, phase: 'offline' });
			if (this.#wanted) this.#retry = setTimeout(() => void this.#load(), RETRY);
		}
	}

	#tell(status: Status): void {
		this.#status = status;
		for (const listener of [...this.#listeners]) listener(status);
	}
}

/** Does a service worker serve this page? Then it has everything. */
function isKept(): boolean {
	const { serviceWorker } = navigator as { serviceWorker?: ServiceWorkerContainer };
	return serviceWorker?.controller != null;
}
