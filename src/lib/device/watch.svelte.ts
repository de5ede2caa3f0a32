/**
 * What screens read: the build, a seam and the state of sync, kept up to date while somebody looks.
 *
 * Each class follows the store only while an effect reads it, so a screen that is left leaves nothing running.
 */
import { createSubscriber } from 'svelte/reactivity';
import type { Entry } from '$lib/logbook/entry';
import type { Build } from '$lib/logbook/fold/build';
import type { Seam } from '$lib/logbook/fold/seam';
import { totalsOf, type SeamSummary, type Totals } from '$lib/logbook/fold/summary';
import type { CrewMember } from '$lib/logbook/wire';
import { appendEntries, type Draft } from './append';
import type { Status } from './loop';
import {
	buildHere,
	builds,
	crewOf,
	foldedBuild,
	foldedSeam,
	summaries,
	type BuildListing
} from './read';
import type { Notice } from './notices';
import type { DeviceStore } from './store';
import type { SyncSource } from './sync';

/** Reads while it is wanted, once at a time; a change during a reading leads to one more. */
class Follower {
	readonly #store: DeviceStore;
	readonly #concerns: (notice: Notice) => boolean;
	readonly #read: (notices: readonly Notice[]) => Promise<void>;
	#pending: Notice[] | undefined;
	#reading = false;
	#stopped = false;

	constructor(
		store: DeviceStore,
		concerns: (notice: Notice) => boolean,
		/** No notices at the first reading: everything is to be read. */
		read: (notices: readonly Notice[]) => Promise<void>
	) {
		this.#store = store;
		this.#concerns = concerns;
		this.#read = read;
	}

	start(): () => void {
		this.#stopped = false;
		const stop = this.#store.subscribe((notice) => {
			if (!this.#concerns(notice)) return;
			(this.#pending ??= []).push(notice);
			void this.#run();
		});
		this.#pending = [];
		void this.#run();
		return () => {
			this.#stopped = true;
			stop();
		};
	}

	async #run(): Promise<void> {
		if (this.#reading) return;
		this.#reading = true;
		try {
			while (this.#pending && !this.#stopped) {
				const notices = this.#pending;
				this.#pending = undefined;
				await this.#read(notices);
			}
		} catch (error) {
			// A store that was closed under a screen that is going away.
			if (!this.#stopped) throw error;
		} finally {
			this.#reading = false;
		}
	}
}

/** The builds on this device. */
export class BuildList {
	readonly #follow: () => void;
	#builds = $state.raw<readonly BuildListing[]>();

	constructor(store: DeviceStore) {
		const follower = new Follower(
			store,
			({ build }) => build !== undefined,
			async () => {
				this.#builds = await builds(store);
			}
		);
		this.#follow = createSubscriber(() => follower.start());
	}

	/** Undefined until it is read. */
	get builds(): readonly BuildListing[] | undefined {
		this.#follow();
		return this.#builds;
	}
}

/**
 * A build in a list, as its log says it is. What the server has not confirmed stays unconfirmed: a build that came in a
 * file has no role yet, one left stays left, and a log that is only on its way here may know no better than its beginning.
 */
export function listingOf(
	listing: BuildListing,
	fold: Pick<Build, 'name' | 'crew'> | undefined,
	person: string
): BuildListing {
	const whole = !listing.known || listing.lastSuccess !== undefined;
	if (!fold || !whole) return listing;
	const name = fold.name === '' ? listing.name : fold.name;
	const said = fold.crew.get(person);
	if (listing.role === null || said === undefined) return { ...listing, name };
	return said === 'left'
		? { ...listing, name, role: null, removed: true }
		: { ...listing, name, role: said };
}

/** One build: what concerns no seam, folded, and a summary of every seam. */
export class BuildLog {
	readonly build: string;
	readonly #store: DeviceStore;
	readonly #follow: () => void;
	#listing = $state.raw<BuildListing>();
	#fold = $state.raw<Build>();
	#summaries = $state.raw<readonly SeamSummary[]>();
	#crew = $state.raw<readonly CrewMember[]>([]);
	#loaded = $state(false);

	constructor(store: DeviceStore, build: string) {
		this.build = build;
		this.#store = store;
		const follower = new Follower(
			store,
			(notice) => notice.build === build,
			(notices) => this.#read(notices)
		);
		this.#follow = createSubscriber(() => follower.start());
	}

	/** False until the first reading has ended; then `listing` says whether the build is on this device. */
	get loaded(): boolean {
		this.#follow();
		return this.#loaded;
	}
	/**
	 * Undefined while loading, and for a build that is not on this device. Its name and this person's role are as the log
	 * says, which hears of a change before the server's list is asked again.
	 */
	get listing(): BuildListing | undefined {
		this.#follow();
		return this.#listing;
	}
	get fold(): Build | undefined {
		this.#follow();
		return this.#fold;
	}
	get summaries(): readonly SeamSummary[] | undefined {
		this.#follow();
		return this.#summaries;
	}
	/** Sums over all seams. */
	get totals(): Totals | undefined {
		const all = this.summaries;
		return all && totalsOf(all);
	}
	/** With names, as the server last told; empty before the first contact. */
	get crew(): readonly CrewMember[] {
		this.#follow();
		return this.#crew;
	}

	/** Adds lines to this build; see {@link appendEntries}. */
	append(drafts: readonly Draft[]): Promise<Entry[]> {
		return appendEntries(this.#store, this.build, drafts);
	}

	async #read(notices: readonly Notice[]): Promise<void> {
		const all = notices.length === 0;
		const parts = notices.flatMap((notice) => notice.parts);
		const listing = await buildHere(this.#store, this.build);
		if (all || parts.includes('')) {
			this.#fold = await foldedBuild(this.#store, this.build);
			this.#crew = await crewOf(this.#store, this.build);
		}
		this.#listing = listing && listingOf(listing, this.#fold, this.#store.person);
		if (all || parts.some((part) => part !== ''))
			this.#summaries = await summaries(this.#store, this.build);
		this.#loaded = true;
	}
}

/** One seam, folded. */
export class SeamLog {
	readonly build: string;
	readonly id: string;
	readonly #store: DeviceStore;
	readonly #follow: () => void;
	#seam = $state.raw<Seam>();

	constructor(store: DeviceStore, build: string, id: string) {
		this.build = build;
		this.id = id;
		this.#store = store;
		const follower = new Follower(
			store,
			(notice) => notice.build === build && notice.parts.includes(id),
			async () => {
				this.#seam = await foldedSeam(store, build, id);
			}
		);
		this.#follow = createSubscriber(() => follower.start());
	}

	/** Undefined until it is read; `planned` says whether the seam is on this device. */
	get seam(): Seam | undefined {
		this.#follow();
		return this.#seam;
	}

	/** Adds lines about this seam, and shows them before it returns. See {@link appendEntries}. */
	async append(drafts: readonly Draft[]): Promise<Entry[]> {
		const entries = await appendEntries(
			this.#store,
			this.build,
			drafts.map((draft) => ({ ...draft, seam: this.id }))
		);
		this.#seam = await foldedSeam(this.#store, this.build, this.id);
		return entries;
	}
}

/** How sync stands, live. */
export class SyncStatus {
	readonly #loop: SyncSource;
	readonly #follow: () => void;
	#status = $state.raw<Status>() as Status;

	constructor(loop: SyncSource) {
		this.#loop = loop;
		this.#status = loop.status;
		this.#follow = createSubscriber(() => {
			this.#status = loop.status;
			return loop.subscribe((status) => {
				this.#status = status;
			});
		});
	}

	get status(): Status {
		this.#follow();
		return this.#status;
	}

	/** The button: a round over everything, also what is not due yet. */
	async tryNow(): Promise<void> {
		await this.#loop.tryNow();
	}
}
