/** A build that stays on this device, as screens see it: being made, here, gone wrong. */
import { DeviceError } from './errors';
import { discardStore, ensureMade, ownLines, type MadeBuild, type Making } from './staying';
import { openStayingStore, type DeviceStore, type StoreOptions } from './store';

export interface StayingOptions extends Pick<StoreOptions, 'prefix' | 'deviceName' | 'env'> {
	/** Of its store. */
	readonly name: string;
	readonly build: string;
	/** As whom lines are written in it. */
	readonly person: string;
	/** Makes all of it; only asked when it is not here whole. */
	readonly make: () => Promise<MadeBuild>;
}

export class StayingBuild {
	readonly #options: StayingOptions;
	#opened: DeviceStore | undefined;
	#store = $state.raw<DeviceStore>();
	#making = $state.raw<Making | 'begun'>();
	#problem = $state.raw<DeviceError>();
	/** Raised with every opening and leaving: what began before must not go on. */
	#turn = 0;

	constructor(options: StayingOptions) {
		this.#options = options;
	}

	/** Undefined while the build is not here whole. */
	get store(): DeviceStore | undefined {
		return this.#store;
	}
	/** How far it is, while it is being made. */
	get making(): Making | 'begun' | undefined {
		return this.#making;
	}
	/** Why it is not here. */
	get problem(): DeviceError | undefined {
		return this.#problem;
	}

	/** Opens the build, and makes it first where it is not here whole. */
	open(): Promise<void> {
		return this.#open(false);
	}

	/** Makes it anew: what was written in it is gone. */
	startOver(): Promise<void> {
		return this.#open(true);
	}

	/** How many lines go with it. */
	async ownLines(): Promise<number> {
		return this.#store ? ownLines(this.#store, this.#options.build) : 0;
	}

	/** Deletes it from this device. */
	async leave(): Promise<void> {
		if (!this.#opened) return;
		await discardStore(this.#opened, this.#options.build);
		this.stop();
	}

	/** Lets go of the store; the build stays here, or what there is of it. */
	stop(): void {
		this.#turn++;
		this.#store = undefined;
		this.#opened?.close();
		this.#opened = undefined;
	}

	async #open(anew: boolean): Promise<void> {
		const { name, person, build, make, ...options } = this.#options;
		const turn = ++this.#turn;
		this.#problem = undefined;
		this.#store = undefined;
		if (anew) this.#making = 'begun';
		try {
			const store = this.#opened ?? (await openStayingStore(name, person, options));
			// A screen that was left while it opened.
			if (turn !== this.#turn) {
				store.close();
				return;
			}
			this.#opened = store;
			await ensureMade(
				store,
				build,
				() => {
					this.#making = 'begun';
					return make();
				},
				{
					anew,
					onprogress: (making) => {
						if (turn === this.#turn) this.#making = making;
					}
				}
			);
			if (turn === this.#turn) this.#store = store;
		} catch (error) {
			// Left while it was being made: the next who comes makes it anew.
			if (turn !== this.#turn) return;
			this.#problem =
				error instanceof DeviceError
					? error
					: new DeviceError('device.store_closed', { cause: error });
		} finally {
			if (turn === this.#turn) this.#making = undefined;
		}
	}
}
