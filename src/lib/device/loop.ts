/**
 * The sync loop: decides when a round runs, and says how things stand.
 *
 *            wake: append (30 ms) · online · visible · page shown · live message · button
 *                 │
 *     ┌────────┐  ▼   ┌─────────┐  done, nothing waits    ┌──────┐
 *     │ timer  ├────► │ syncing ├───────────────────────► │ idle │ ── wake, or every 5 min ──┐
 *     └────────┘      └────┬────┘                         └──────┘                           │
 *         ▲   ▲            │ something waits, or a fault   ┌─────────┐                       │
 *         │   └────────────┼─────────────────────────────► │ offline │ ── wake, back-off ────┤
 *         │                ├─ 401 session.none ──────────► │ signed_out │ ── wake, 5 min ────┤
 *         │                └─ 409 session.other_person ──► │ other_person │ ── wake, 5 min ──┤
 *         └──────────────────────────────────────────────────────────────────────────────────┘
 *
 * It is level-triggered. What must hold: from every state, and while anything waits in particular, a next attempt is
 * scheduled; no state waits for an event that may never come. `start` and every end of a round go through `#schedule`,
 * and nothing else ends a round. Every request is bounded by the transport, so every round ends.
 *
 * One round at a time on the whole device: a Web Lock, taken only for the round. A frozen tab may keep it, so a visible
 * tab that has waited for it for a minute runs without: rounds are harmless to each other, only wasteful.
 */
import { sentence } from '$lib/logbook/refusals';
import { faultOf, type Fault } from './faults';
import { syncRound, type BuildReport, type RoundReport } from './round';
import { outboxCounts } from './read';
import { unplacedRows } from './outgoing';
import type { BuildRow, OutboxState } from './schema';
import type { DeviceStore } from './store';
import type { Transport } from './transport';

export type Phase = 'idle' | 'syncing' | 'offline' | 'signed_out' | 'other_person';

export interface BuildStatus {
	readonly build: string;
	readonly name: string;
	readonly waiting: number;
	readonly held: number;
	readonly pending: number;
	readonly refused: number;
	readonly discarded: number;
	readonly parked: number;
	/** On the server's disk, but not yet seen in its log by this device. */
	readonly acknowledgedNotBack: number;
	/** Offered again after the server's history changed, still lacking there. */
	readonly offeredAgain: number;
	readonly cursor: number;
	readonly head: number;
	readonly removed: boolean;
	readonly lastSuccess?: number;
	readonly fault?: Fault;
	/** Nothing waiting, sent or held, and everything the server was last known to have is here. */
	readonly synced: boolean;
}

export interface Status {
	readonly phase: Phase;
	/** Sums over the builds. Refused, pending and discarded lines stand beside "synced", not against it. */
	readonly waiting: number;
	readonly held: number;
	readonly pending: number;
	readonly refused: number;
	readonly discarded: number;
	readonly parked: number;
	readonly acknowledgedNotBack: number;
	readonly offeredAgain: number;
	readonly synced: boolean;
	/** When a round last went through without a fault, in ms since 1970. */
	readonly lastSuccess?: number;
	readonly nextTry?: number;
	readonly lastError?: Fault & { readonly at: number };
	readonly builds: readonly BuildStatus[];
}

export interface LoopEnv {
	/** Is somebody looking at this tab? */
	readonly visible: () => boolean;
	readonly locks: Pick<LockManager, 'request'> | undefined;
	readonly random: () => number;
	/** Milliseconds from any start that no clock setting moves: for how long something lasted. */
	readonly elapsed: () => number;
}

const APPEND_DEBOUNCE = 30;
const LEAST_BACKOFF = 1000;
const MOST_BACKOFF = 300_000;
/** With nothing to do: another device may have written, and no live stream told so. */
const IDLE = 300_000;
const IDLE_VISIBLE = 60_000;
/** Another tab runs a round. */
const LOCK_BUSY = 500;
const LOCK_PATIENCE = 60_000;
/** The list of builds is asked for again after so long, also when only one build has something to do. */
const LIST_AGE = 60_000;
const LIVE_LEAST = 2000;
const STATUS_DEBOUNCE = 20;
/** Of the time, at most one part in so many goes into counting what waits: with ten thousand lines a count is long. */
const STATUS_SHARE = 10;
const MOST_STATUS_COST = 100;

const OF_THE_PAGE: LoopEnv = {
	visible: () => typeof document === 'undefined' || document.visibilityState === 'visible',
	locks:
		typeof navigator === 'undefined' ? undefined : (navigator as { locks?: LockManager }).locks,
	random: () => Math.random(),
	elapsed: () => performance.now()
};

type Timer = ReturnType<typeof setTimeout>;

export class SyncLoop {
	readonly #store: DeviceStore;
	readonly #transport: Transport;
	readonly #env: LoopEnv;
	readonly #listeners = new Set<(status: Status) => void>();
	readonly #stops: (() => void)[] = [];
	#status: Status;
	#phase: Phase = 'idle';
	#running = false;
	#stopped = true;
	#timer: Timer | undefined;
	#nextTry: number | undefined;
	#failures = 0;
	/** Builds that asked for a round; `everything` for all of them and the list. */
	#asked = new Set<string>();
	#everything = true;
	#tryNow = false;
	#listedAt = -Infinity;
	#lockWaitedSince: number | undefined;
	#reports = new Map<string, BuildReport>();
	#lastSuccess: number | undefined;
	#lastError: (Fault & { at: number }) | undefined;
	#endLive: (() => void) | undefined;
	#liveTimer: Timer | undefined;
	#liveFailures = 0;
	#statusTimer: Timer | undefined;
	/** How long the last count took, in ms. */
	#statusCost = 0;
	#waitingForRound: (() => void)[] = [];

	/** @throws Error for a store that stays: nothing of it may reach a server, whoever asks */
	constructor(store: DeviceStore, transport: Transport, env: Partial<LoopEnv> = {}) {
		if (store.stays) throw new Error('this store is never synced');
		this.#store = store;
		this.#transport = transport;
		this.#env = { ...OF_THE_PAGE, ...env };
		this.#status = { ...this.#sum([]), phase: 'idle' };
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

	/** Begins; the first round starts at once. */
	start(): void {
		if (!this.#stopped) return;
		this.#stopped = false;
		this.#stops.push(
			this.#store.subscribe(({ build, appended }) => {
				this.#refreshSoon();
				if (appended && build !== undefined) this.#wake(APPEND_DEBOUNCE, build);
			})
		);
		if (typeof window !== 'undefined') {
			const shown = () => {
				this.#followVisibility();
				if (this.#env.visible()) this.#wake(0);
			};
			const online = () => {
				this.#failures = 0;
				this.#wake(0);
			};
			window.addEventListener('online', online);
			window.addEventListener('pageshow', shown);
			document.addEventListener('visibilitychange', shown);
			this.#stops.push(() => {
				window.removeEventListener('online', online);
				window.removeEventListener('pageshow', shown);
				document.removeEventListener('visibilitychange', shown);
			});
		}
		this.#followVisibility();
		this.#wake(0);
		this.#refreshSoon();
	}

	/** Ends; a round that is under way finishes its step. The store stays open. */
	stop(): void {
		this.#stopped = true;
		clearTimeout(this.#timer);
		clearTimeout(this.#statusTimer);
		clearTimeout(this.#liveTimer);
		this.#timer = this.#statusTimer = this.#liveTimer = undefined;
		this.#endLive?.();
		this.#endLive = undefined;
		for (const stop of this.#stops.splice(0)) stop();
		for (const go of this.#waitingForRound.splice(0)) go();
	}

	/** The button: a round over everything, also what is not due. Resolves when it has ended. */
	async tryNow(): Promise<Status> {
		if (this.#stopped) return this.#status;
		this.#tryNow = true;
		this.#failures = 0;
		this.#lockWaitedSince ??= this.#env.elapsed();
		const ended = new Promise<void>((resolve) => this.#waitingForRound.push(resolve));
		this.#wake(0);
		await ended;
		return this.#status;
	}

	/** Asks for a round: of one build, or of everything. Sooner than scheduled, never later. */
	#wake(after: number, build?: string): void {
		if (this.#stopped) return;
		if (build === undefined) this.#everything = true;
		else this.#asked.add(build);
		// While a round runs it is enough to have asked: the end of it looks.
		if (!this.#running) this.#schedule(after);
	}

	#schedule(after: number): void {
		if (this.#stopped) return;
		const at = this.#store.env.now() + after;
		if (this.#timer !== undefined && this.#nextTry !== undefined && this.#nextTry <= at) return;
		clearTimeout(this.#timer);
		this.#nextTry = at;
		this.#timer = setTimeout(() => void this.#run(), after);
		this.#refreshSoon();
	}

	async #run(): Promise<void> {
		this.#timer = undefined;
		this.#nextTry = undefined;
		if (this.#running || this.#stopped) return;
		this.#running = true;
		let after = LEAST_BACKOFF;
		try {
			after = await this.#locked();
		} catch (error) {
			// Not even the store could be read. The timer comes back.
			this.#fail(faultOf(error));
			after = this.#backOff();
		} finally {
			this.#running = false;
			this.#schedule(this.#everything || this.#asked.size > 0 ? Math.min(after, LOCK_BUSY) : after);
			await this.#refresh();
		}
	}

	/** A round under the lock. @returns after how many ms the next is due */
	async #locked(): Promise<number> {
		const { locks } = this.#env;
		const since = this.#lockWaitedSince;
		const patient = since === undefined || this.#env.elapsed() - since < LOCK_PATIENCE;
		if (!locks || (!patient && this.#env.visible())) return this.#round();
		const name = `tallybar.sync.${this.#store.prefix}${this.#store.person}`;
		return locks.request(name, { ifAvailable: true }, async (lock) => {
			if (lock) return this.#round();
			this.#lockWaitedSince ??= this.#env.elapsed();
			return LOCK_BUSY;
		});
	}

	async #round(): Promise<number> {
		this.#lockWaitedSince = undefined;
		const now = this.#env.elapsed();
		const everything =
			this.#everything || this.#tryNow || this.#asked.size === 0 || now - this.#listedAt > LIST_AGE;
		const only = everything ? undefined : [...this.#asked];
		const tryNow = this.#tryNow;
		this.#everything = false;
		this.#tryNow = false;
		this.#asked = new Set();
		this.#setPhase('syncing');
		const report = await syncRound(this.#store, this.#transport, {
			...(only && { only }),
			tryNow
		});
		if (everything && report.outcome === 'done') this.#listedAt = now;
		const after = this.#take(report, everything);
		for (const go of this.#waitingForRound.splice(0)) {
			// After the status below has been told.
			void this.#refresh().then(go);
		}
		return after;
	}

	/** Draws the conclusions of a round. @returns after how many ms the next is due */
	#take(report: RoundReport, everything: boolean): number {
		if (everything && report.outcome === 'done') this.#reports = new Map(report.builds);
		else for (const [build, one] of report.builds) this.#reports.set(build, one);
		const faults = [...report.builds.values()].flatMap(({ fault }) => (fault ? [fault] : []));
		const fault = report.fault ?? faults[0];
		if (fault) this.#fail(fault);
		else {
			this.#failures = 0;
			this.#lastSuccess = this.#store.env.now();
			this.#lastError = undefined;
		}
		switch (report.outcome) {
			case 'signed_out':
			case 'other_person':
				this.#setPhase(report.outcome);
				// Signing in reloads or wakes; the timer is for when neither is heard of.
				return MOST_BACKOFF;
			case 'offline':
				this.#setPhase('offline');
				return this.#backOff();
			case 'done':
				this.#setPhase('idle');
		}
		const idle = this.#env.visible() ? IDLE_VISIBLE : IDLE;
		if (fault) return this.#backOff();
		if (report.nextDue === undefined) return idle;
		// Due already and still here: written while the round ended, or bounced. Not at once, not never.
		return Math.min(idle, Math.max(LEAST_BACKOFF, report.nextDue - this.#store.env.now()));
	}

	#fail(fault: Fault): void {
		this.#failures++;
		this.#lastError = { ...fault, at: this.#store.env.now() };
	}

	/** Doubling from 1 s to 5 min, spread over half to the whole so that a restarted server is not met by all at once. */
	#backOff(): number {
		const full = Math.min(MOST_BACKOFF, LEAST_BACKOFF * 2 ** Math.min(this.#failures - 1, 12));
		return full * (0.5 + this.#env.random() / 2);
	}

	#setPhase(phase: Phase): void {
		if (this.#phase === phase) return;
		this.#phase = phase;
		this.#tell({ ...this.#status, phase });
	}

	// ---- live ------------------------------------------------------------------------------------------------

	/** A stream only while somebody looks: six idle tabs would leave no connection for a push. */
	#followVisibility(): void {
		if (this.#stopped) return;
		if (!this.#env.visible()) {
			clearTimeout(this.#liveTimer);
			this.#liveTimer = undefined;
			this.#endLive?.();
			this.#endLive = undefined;
			return;
		}
		if (this.#endLive || this.#liveTimer !== undefined) return;
		let open = true;
		const end = this.#transport.live({
			message: ({ build }) => {
				this.#liveFailures = 0;
				this.#wake(0, build);
			},
			closed: () => {
				if (!open) return;
				open = false;
				end();
				this.#endLive = undefined;
				const wait = Math.min(MOST_BACKOFF, LIVE_LEAST * 2 ** Math.min(this.#liveFailures++, 8));
				this.#liveTimer = setTimeout(
					() => {
						this.#liveTimer = undefined;
						this.#followVisibility();
					},
					wait * (0.5 + this.#env.random() / 2)
				);
			}
		});
		this.#endLive = () => {
			open = false;
			end();
		};
	}

	// ---- status ----------------------------------------------------------------------------------------------

	#refreshSoon(): void {
		if (this.#stopped) return;
		this.#statusTimer ??= setTimeout(
			() => {
				this.#statusTimer = undefined;
				void this.#refresh();
			},
			Math.max(STATUS_DEBOUNCE, this.#statusCost * STATUS_SHARE)
		);
	}

	async #refresh(): Promise<void> {
		const started = this.#env.elapsed();
		try {
			const builds = await statusOfBuilds(this.#store, this.#reports);
			this.#statusCost = Math.min(MOST_STATUS_COST, this.#env.elapsed() - started);
			this.#tell({ ...this.#sum(builds), phase: this.#phase });
		} catch (error) {
			const fault = faultOf(error);
			this.#tell({ ...this.#status, lastError: { ...fault, at: this.#store.env.now() } });
		}
	}

	#sum(builds: readonly BuildStatus[]): Status {
		const sum = (count: (status: BuildStatus) => number) =>
			builds.reduce((total, status) => total + count(status), 0);
		return {
			phase: this.#phase,
			waiting: sum(({ waiting }) => waiting),
			held: sum(({ held }) => held),
			pending: sum(({ pending }) => pending),
			refused: sum(({ refused }) => refused),
			discarded: sum(({ discarded }) => discarded),
			parked: sum(({ parked }) => parked),
			acknowledgedNotBack: sum(({ acknowledgedNotBack }) => acknowledgedNotBack),
			offeredAgain: sum(({ offeredAgain }) => offeredAgain),
			// Before the first answer nothing is known of the server: an empty store is not a synced one.
			synced: this.#lastSuccess !== undefined && builds.every(({ synced }) => synced),
			...(this.#lastSuccess !== undefined && { lastSuccess: this.#lastSuccess }),
			...(this.#nextTry !== undefined && { nextTry: this.#nextTry }),
			...(this.#lastError && { lastError: this.#lastError }),
			builds
		};
	}

	#tell(status: Status): void {
		this.#status = status;
		for (const listener of [...this.#listeners]) listener(status);
	}
}

/** How each build of a store stands, from the store alone. */
export async function statusOfBuilds(
	store: DeviceStore,
	reports: ReadonlyMap<string, BuildReport> = new Map()
): Promise<BuildStatus[]> {
	const rows = await store.handle.run((db) => db.getAll('builds'));
	return Promise.all(rows.map((row) => statusOf(store, row, reports.get(row.build)?.fault)));
}

async function statusOf(
	store: DeviceStore,
	row: BuildRow,
	fault: Fault | undefined
): Promise<BuildStatus> {
	const counts: Record<OutboxState, number> = await outboxCounts(store, row.build);
	const { waiting, held, pending, refused, discarded, parked, acknowledged } = counts;
	const offeredAgain = row.reoffer ? (await unplacedRows(store, row.build)).length : 0;
	const onTheWay = waiting + held + parked + acknowledged;
	const removed = row.removed && { code: 'build.removed', says: sentence('build.removed') };
	const because = removed === false ? fault : removed;
	return {
		build: row.build,
		name: row.name,
		waiting,
		held,
		pending,
		refused,
		discarded,
		parked,
		acknowledgedNotBack: acknowledged,
		offeredAgain,
		cursor: row.cursor.seq,
		head: row.head,
		removed: row.removed,
		...(row.lastSuccess !== undefined && { lastSuccess: row.lastSuccess }),
		...(because && { fault: because }),
		synced:
			onTheWay === 0 && !row.reoffer && (row.removed || (row.known && row.cursor.seq >= row.head))
	};
}
