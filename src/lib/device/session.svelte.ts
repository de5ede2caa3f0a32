/** The session as screens see it: who logs here, their store, and its sync. Works before and without any network. */
import { DeviceError } from './errors';
import { lastPerson } from './registry';
import { askSession } from './session';
import { closeStore, deleteStore, unsent, type Unsent } from './sign-out';
import { openStore, type DeviceStore, type StoreOptions } from './store';
import { Sync } from './sync';
import type { Transport } from './transport';

/**
 * loading: nothing is known yet. signed_in: the server says so. offline: it could not be asked; whoever was signed in
 * last logs on. expired: it says nobody is signed in; they log on too, and have to sign in again before anything is sent.
 * nobody: nobody is signed in and nobody was.
 */
export type Standing = 'loading' | 'signed_in' | 'offline' | 'expired' | 'nobody';

export interface SessionOptions extends Pick<StoreOptions, 'prefix' | 'deviceName' | 'env'> {
	readonly ask?: typeof askSession;
	readonly transport?: (person: string) => Transport;
}

export class Session {
	readonly #options: SessionOptions;
	#standing = $state<Standing>('loading');
	#person = $state.raw<{ readonly id: string; readonly name: string }>();
	#store = $state.raw<DeviceStore>();
	#loop = $state.raw<Sync>();
	#problem = $state.raw<DeviceError>();
	/** One thing after the other: two who open a store at a time would leave a second loop running. */
	#turn: Promise<unknown> = Promise.resolve();

	constructor(options: SessionOptions = {}) {
		this.#options = options;
	}

	get standing(): Standing {
		return this.#standing;
	}
	get person(): { readonly id: string; readonly name: string } | undefined {
		return this.#person;
	}
	/** The person's store; undefined while loading, for nobody, and when it cannot be opened. */
	get store(): DeviceStore | undefined {
		return this.#store;
	}
	get loop(): Sync | undefined {
		return this.#loop;
	}
	/** Why there is no store, to be said aloud: nothing can be logged then. */
	get problem(): DeviceError | undefined {
		return this.#problem;
	}

	/** Opens the store of whoever was here last, at once; then asks the server, which may know of somebody else. */
	start(): Promise<void> {
		return this.#inTurn(() => this.#start());
	}

	/** Asks the server again: after signing in, and when the loop reports that somebody else is signed in. */
	check(): Promise<void> {
		return this.#inTurn(() => this.#check());
	}

	/** What would be lost with the store on this device. */
	async unsent(): Promise<Unsent | undefined> {
		return this.#store && unsent(this.#store);
	}

	/**
	 * Leaves: the store stays, closed; or is deleted, when nothing is unsent or `count` is what the person was shown.
	 * The session with the server is ended by the sign-out form, not here.
	 * @returns what is unsent when that kept the store from being deleted; nothing was changed then
	 */
	leave(how: 'keep' | { readonly delete: number }): Promise<Unsent | undefined> {
		return this.#inTurn(() => this.#leave(how));
	}

	/** Lets go of everything; the store stays as it is. */
	stop(): void {
		this.#loop?.stop();
		this.#store?.close();
		this.#loop = undefined;
		this.#store = undefined;
	}

	#inTurn<T>(what: () => Promise<T>): Promise<T> {
		const turn = this.#turn.then(what, what);
		this.#turn = turn;
		return turn;
	}

	async #start(): Promise<void> {
		try {
			const last = await lastPerson({ prefix: this.#options.prefix ?? '' });
			if (last) {
				await this.#become(last.person, last.name);
				this.#standing = 'offline';
			}
		} catch (error) {
			this.#fail(error);
		}
		await this.#check();
	}

	async #check(): Promise<void> {
		const said = await (this.#options.ask ?? askSession)();
		if (typeof said === 'string') {
			// Whoever logs here goes on. That they are signed out only a 401 may say, which the loop hears at once.
			if (!this.#person) this.#standing = 'nobody';
			else if (said === 'signed_out') this.#standing = 'expired';
			else if (this.#standing !== 'expired') this.#standing = 'offline';
			return;
		}
		try {
			if (this.#person?.id !== said.id || !this.#store) await this.#become(said.id, said.name);
			this.#person = { id: said.id, name: said.name };
			this.#standing = 'signed_in';
			// Just now the server answers, to this person: nothing waits for the next try.
			const phase = this.#loop?.status.phase;
			if (phase !== 'idle' && phase !== 'syncing') void this.#loop?.tryNow();
		} catch (error) {
			this.#person = { id: said.id, name: said.name };
			this.#standing = 'signed_in';
			this.#fail(error);
		}
	}

	async #leave(how: 'keep' | { readonly delete: number }): Promise<Unsent | undefined> {
		const store = this.#store;
		if (!store) return undefined;
		this.#loop?.stop();
		if (how === 'keep') await closeStore(store);
		else {
			const answer = await deleteStore(store, how.delete);
			if (!answer.deleted) {
				this.#loop?.start();
				return answer.unsent;
			}
		}
		this.#store = undefined;
		this.#loop = undefined;
		this.#person = undefined;
		this.#standing = 'nobody';
		return undefined;
	}

	async #become(id: string, name: string): Promise<void> {
		this.stop();
		const { transport, prefix, deviceName, env } = this.#options;
		const options: StoreOptions = {
			...(prefix !== undefined && { prefix }),
			...(deviceName !== undefined && { deviceName }),
			...(env && { env })
		};
		this.#person = { id, name };
		const store = await openStore(id, { ...options, ...(name !== '' && { name }) });
		this.#problem = undefined;
		this.#store = store;
		const loop = new Sync(store, transport);
		this.#loop = loop;
		loop.subscribe(({ phase, lastSuccess }) => {
			if (this.#loop !== loop) return;
			// What the server says in passing is as good as what it says when asked.
			if (phase === 'signed_out') this.#standing = 'expired';
			else if (phase === 'offline' && this.#standing === 'signed_in') this.#standing = 'offline';
			else if (phase === 'idle' && lastSuccess !== undefined) this.#standing = 'signed_in';
		});
		loop.start();
	}

	#fail(error: unknown): void {
		this.#problem =
			error instanceof DeviceError
				? error
				: new DeviceError('device.store_closed', { cause: error });
	}
}
