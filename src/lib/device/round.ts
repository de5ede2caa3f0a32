/**
 * One round of sync: for every build, follow the server's history to its head, offer what it lacks, follow again.
 *
 * What must hold: every step may be lost, doubled or overtaken by another tab at any point, and the next round puts it
 * right. So a round decides from the store alone, writes each step in one transaction, and never drops a line.
 */
import { hashText } from '$lib/logbook/bytes';
import { PAGE, type PullAnswer, type PushAnswer } from '$lib/logbook/wire';
import {
	absorbList,
	absorbPage,
	absorbResults,
	countFailure,
	endReoffer,
	keepCrew,
	noteBuild,
	offerAgain,
	parkLine,
	startOver,
	type Outcome
} from './absorb';
import { wallTime } from './clock';
import { BrokenHistory, faultOf, type Fault } from './faults';
import {
	dueRows,
	FormerHistory,
	makeBatch,
	nextDue,
	unplacedRows,
	type Batch,
	type Key
} from './outgoing';
import { crewOf } from './read';
import { within, type BuildRow } from './schema';
import type { DeviceStore } from './store';
import { Refused, Unreachable, type Transport } from './transport';
import { checkPage, Keys } from './verify';

export interface RoundOptions {
	/** Only these builds, without asking for the list: after a tap, after a live message. */
	readonly only?: readonly string[];
	/** Also what is not due yet: a person pressed the button. */
	readonly tryNow?: boolean;
	readonly signal?: AbortSignal;
}

export interface BuildReport {
	/** Everything the server has is here. */
	readonly atHead: boolean;
	readonly fault?: Fault;
}

export interface RoundReport {
	/**
	 * done: each build was tried, see there. offline: the server could not be asked. signed_out, other_person: it knows
	 * nobody, or somebody else; nothing was sent on.
	 */
	readonly outcome: 'done' | 'offline' | 'signed_out' | 'other_person';
	readonly fault?: Fault;
	readonly builds: ReadonlyMap<string, BuildReport>;
	/** When the next line is due to be offered, in ms since 1970; in the past when some already are. */
	readonly nextDue?: number;
}

/** Tries of a single line on which the server fails while it answers otherwise, before it is put aside. */
const TRIES_ALONE = 3;
const MOST_ASKED = 5000;

/** An answer this fast leaves room for one twice as long before the transport gives up. */
const QUICK = 4000;
/** A page is never made shorter than this: what is slow then is not the page. */
const LEAST_PULLED = 20;

/** How much a connection carries before it times out: kept from round to round, or a slow one would never get through. */
interface Pace {
	push: number;
	pull: number;
}
const paces = new WeakMap<Transport, Pace>();

function paceOf(transport: Transport): Pace {
	let pace = paces.get(transport);
	if (!pace) paces.set(transport, (pace = { push: Infinity, pull: PAGE }));
	return pace;
}

/** One round over all builds, or those named. Never throws: what went wrong is in the report. */
export async function syncRound(
	store: DeviceStore,
	transport: Transport,
	options: RoundOptions = {}
): Promise<RoundReport> {
	const reports = new Map<string, BuildReport>();
	let listFault: Fault | undefined;
	try {
		if (!options.only) {
			try {
				await absorbList(store, await transport.builds());
			} catch (error) {
				// A fault of the list alone must not stop the builds; no answer at all stops everything.
				if (!(error instanceof Unreachable) || error.reason !== 'server') throw error;
				listFault = faultOf(error);
			}
		}
		const keys = new Keys();
		for (const build of options.only ?? (await buildsHere(store))) {
			options.signal?.throwIfAborted();
			const one = new BuildRound(store, transport, keys, build, options.tryNow === true);
			try {
				reports.set(build, { atHead: await one.run() });
			} catch (error) {
				if (sessionOutcome(error)) throw error;
				reports.set(build, { atHead: false, fault: faultOf(error) });
			}
		}
	} catch (error) {
		return {
			outcome: sessionOutcome(error) ?? 'offline',
			fault: faultOf(error),
			builds: reports,
			...(await earliest(store))
		};
	}
	return {
		outcome: 'done',
		...(listFault && { fault: listFault }),
		builds: reports,
		...(await earliest(store))
	};
}

async function earliest(store: DeviceStore): Promise<{ nextDue?: number }> {
	let next: number | undefined;
	try {
		for (const build of await buildsHere(store)) {
			const due = await nextDue(store, build);
			if (due !== undefined && (next === undefined || due < next)) next = due;
		}
	} catch {
		// The store cannot be read just now; the loop comes back by its timer.
	}
	return next === undefined ? {} : { nextDue: next };
}

function buildsHere(store: DeviceStore): Promise<string[]> {
	return store.handle.run((db) => db.getAllKeys('builds'));
}

function sessionOutcome(error: unknown): 'signed_out' | 'other_person' | undefined {
	if (!(error instanceof Refused)) return undefined;
	if (error.status === 401) return 'signed_out';
	return error.code === 'session.other_person' ? 'other_person' : undefined;
}

/** The round of one build. */
class BuildRound {
	readonly #store: DeviceStore;
	readonly #transport: Transport;
	readonly #keys: Keys;
	readonly #build: string;
	readonly #tryNow: boolean;
	#crewChanged = false;
	#crewAsked = false;
	/** A fault that did not keep the round from going on. */
	#fault: unknown;

	constructor(
		store: DeviceStore,
		transport: Transport,
		keys: Keys,
		build: string,
		tryNow: boolean
	) {
		this.#store = store;
		this.#transport = transport;
		this.#keys = keys;
		this.#build = build;
		this.#tryNow = tryNow;
	}

	/** @returns whether everything the server has is here */
	async run(): Promise<boolean> {
		for (let again = false; ; again = true) {
			try {
				return await this.#once();
			} catch (error) {
				// Noticed while offering: the store has started over; this time it follows and offers again.
				const differs = error instanceof Refused && error.code === 'history.differs';
				if (!differs || again) throw error;
			}
		}
	}

	async #once(): Promise<boolean> {
		let atHead = await this.#pull();
		if ((await this.#row())?.reoffer) atHead = (await this.#reoffer()) && atHead;
		if (await this.#push()) atHead = await this.#pull();
		const row = await this.#row();
		if (!row) return false;
		if (!row.removed && row.known) await this.#refreshCrew();
		if (this.#fault !== undefined) throw this.#fault as Error;
		if (atHead) await noteBuild(this.#store, this.#build, { lastSuccess: this.#store.env.now() });
		return atHead;
	}

	async #row(): Promise<BuildRow | undefined> {
		return this.#store.handle.run((db) => db.get('builds', this.#build));
	}

	/**
	 * Follows the history to its head.
	 * @returns false when there is nothing to follow: a build only this device knows yet, or no longer may
	 */
	async #pull(): Promise<boolean> {
		const first = await this.#row();
		if (!first || first.removed || !first.known) return false;
		// Acknowledged before this pull begins: it must bring them back.
		const awaited = await this.#store.handle.run((db) =>
			db.getAllFromIndex('outbox', 'byState', within(this.#build, 'acknowledged'))
		);
		for (let restarts = 0; ;) {
			const row = await this.#row();
			if (!row) return false;
			try {
				if (await this.#pullPage(row)) break;
			} catch (error) {
				if (!(error instanceof Refused)) throw error;
				if (error.code === 'build.removed') {
					await noteBuild(this.#store, this.#build, { removed: true, role: null });
					return false;
				}
				const lost = error.code === 'history.differs' || error.code === 'build.unknown';
				if (!lost || row.cursor.seq === 0 || restarts++ > 2) {
					// Not known there (any more): what waits is offered all the same, and may begin the build anew.
					if (error.code === 'build.unknown') {
						this.#fault = error;
						return false;
					}
					throw error;
				}
				await startOver(this.#store, this.#build, row.cursor);
			}
		}
		this.#fault = undefined;
		await offerAgain(this.#store, this.#build, awaited);
		return true;
	}

	/** @returns true at the head */
	async #pullPage(row: BuildRow): Promise<boolean> {
		const pace = paceOf(this.#transport);
		const limit = pace.pull;
		const asked = this.#store.env.now();
		let answer: PullAnswer;
		try {
			answer = await this.#transport.pull(this.#build, row.cursor, limit);
		} catch (error) {
			// The next round asks for less; this one ends, or a dead connection would be waited for again and again.
			if (isTimeout(error)) pace.pull = Math.max(LEAST_PULLED, Math.floor(limit / 2));
			throw error;
		}
		if (this.#store.env.now() - asked < QUICK) pace.pull = Math.min(PAGE, limit * 2);
		const known = await this.#store.handle.run((db) => db.getAll('devices', within(this.#build)));
		const page = await checkPage(row, known, answer, this.#keys);
		const stored = await absorbPage(this.#store, this.#build, page);
		if (page.lines.some(({ row: { kind } }) => /^(crew|owner)\./.test(kind)))
			this.#crewChanged = true;
		return stored && page.next.seq >= page.head;
	}

	/**
	 * Offers what is due, in order of n, in batches.
	 * @returns whether the server took notice of anything
	 */
	async #push(): Promise<boolean> {
		let pushed = false;
		let keys = await dueRows(this.#store, this.#build, 'all states', this.#tryNow);
		// Lines written meanwhile go out too; what was offered is no longer due, so this ends.
		for (let pass = 0; keys.length > 0 && pass < 1000; pass++) {
			if (!(await this.#offer(keys))) break;
			pushed = true;
			keys = await dueRows(this.#store, this.#build, 'waiting', false);
		}
		return pushed;
	}

	/**
	 * Offers these lines, halving where the server will not take so much at once or fails, down to one; a single line on
	 * which it keeps failing is parked and the rest goes on.
	 */
	async #offer(keys: readonly Key[], former?: FormerHistory): Promise<boolean> {
		let pushed = false;
		const pace = paceOf(this.#transport);
		let most = pace.push;
		let at = 0;
		while (at < keys.length) {
			const rest = keys.slice(at);
			// One that was parked goes alone: it must not take others down with it again.
			const alone = rest.findIndex(({ parked }) => parked);
			const now = alone === -1 ? rest : alone === 0 ? rest.slice(0, 1) : rest.slice(0, alone);
			const batch = await makeBatch(this.#store, this.#build, now, most, former);
			if (batch.rows.length === 0) {
				at += Math.max(batch.taken, 1);
				continue;
			}
			const offered = this.#store.env.now();
			try {
				await this.#pushBatch(batch);
				pushed = true;
				at += batch.taken;
				if (this.#store.env.now() - offered < QUICK) most *= 2;
				pace.push = Math.max(pace.push, most);
			} catch (error) {
				if (!isForSmaller(error)) throw error;
				if (batch.rows.length > 1) {
					most = Math.floor(batch.rows.length / 2);
					if (isTimeout(error)) pace.push = most;
					continue;
				}
				const key = now[batch.taken - 1] as Key;
				if (!(await this.#giveWay(key, error, pushed))) throw error;
				at += batch.taken;
			}
		}
		return pushed;
	}

	/** A single line the server fails on. @returns whether to go on with the next */
	async #giveWay(key: Key, error: unknown, othersPassed: boolean): Promise<boolean> {
		const tooLarge = statusOf(error) === 413;
		// That others passed says little against this one when nothing was answered at all.
		if (isTimeout(error)) othersPassed = false;
		const tries = await countFailure(this.#store, key);
		this.#fault = error;
		// Nothing has passed: the server itself may be ill, and the line is not to blame at once.
		if (!tooLarge && !othersPassed && !key.parked && tries < TRIES_ALONE) return false;
		await parkLine(this.#store, key, tooLarge ? 'request.too_large' : 'request.internal');
		if (tooLarge || othersPassed) this.#fault = undefined;
		return true;
	}

	async #pushBatch(batch: Batch): Promise<PushAnswer> {
		const row = await this.#row();
		if (!row) throw new BrokenHistory('the build has gone');
		const { seq, link } = row.cursor;
		let answer: PushAnswer;
		try {
			answer = await this.#transport.push(this.#build, {
				device: this.#store.device,
				cursor: { seq, link },
				sentAt: wallTime(this.#store.env),
				entries: batch.rows.map(({ text }) => text),
				seals: batch.seals.map(({ device, hashes, signature }) => ({
					device,
					hashes: [...hashes],
					signature
				})),
				...(batch.proofs.length > 0 && { proofs: [...batch.proofs] })
			});
		} catch (error) {
			if (error instanceof Refused && error.code === 'history.differs')
				await startOver(this.#store, this.#build, row.cursor);
			throw error;
		}
		const { results } = answer;
		if (results.length !== batch.rows.length)
			throw new Unreachable('answer', 200, undefined, { cause: 'not one result per line' });
		const outcomes = batch.rows.map(({ n, id, build }, i): Outcome => ({
			row: { build, n, id },
			result: results[i] as Outcome['result']
		}));
		await absorbResults(this.#store, this.#build, outcomes, answer.maxN);
		const { device } = this.#store;
		// Refused as a device that has another key or person elsewhere, it would be refused in every further build.
		const spent = batch.rows.some(
			(own, i) =>
				own.device === device &&
				own.kind === 'device.enrolled' &&
				results[i]?.code === 'device.enrolled_before'
		);
		if (spent || (answer.mint && batch.rows.some((own) => own.device === device)))
			await this.#store.mintDevice();
		return answer;
	}

	/**
	 * After the history changed: asks for every line here that has no place in the new one, and offers those the server
	 * lacks, whoever wrote them, with the proof that they once stood in its log or the seals that came with them.
	 * @returns whether nothing lacks any more
	 */
	async #reoffer(): Promise<boolean> {
		for (let pass = 0; pass < 20; pass++) {
			const row = await this.#row();
			if (!row?.reoffer || row.removed) return true;
			const unplaced = await unplacedRows(this.#store, this.#build);
			const lacking = await this.#lacking(unplaced.map(({ id }) => id));
			// Neither lacking nor in the history that was followed to its head: the server holds it, or has it since.
			const held = unplaced.filter(({ id }) => !lacking.has(id));
			await absorbResults(
				this.#store,
				this.#build,
				held.map((key) => ({ row: key, result: { id: key.id, status: 'held' } })),
				0
			);
			const keys = unplaced
				.filter(({ id }) => lacking.has(id))
				.map((key): Key => ({ ...key, parked: false }));
			if (keys.length === 0) {
				await endReoffer(this.#store, this.#build, row.history);
				return true;
			}
			const before = digestOf(keys);
			const former = await FormerHistory.read(this.#store, this.#build);
			await this.#offer(keys, former);
			this.#fault = undefined;
			await this.#pull();
			const left = await unplacedRows(this.#store, this.#build);
			// Nothing moved: another round, later.
			if (digestOf(left) === before) return false;
		}
		return false;
	}

	async #lacking(ids: readonly string[]): Promise<ReadonlySet<string>> {
		const lacking = new Set<string>();
		for (let i = 0; i < ids.length; i += MOST_ASKED) {
			const asked = ids.slice(i, i + MOST_ASKED);
			try {
				for (const id of await this.#transport.have(this.#build, asked)) lacking.add(id);
			} catch (error) {
				// It has lost the whole build, or that this person is in its crew: it lacks everything.
				if (!(error instanceof Refused) || error.code !== 'build.unknown') throw error;
				for (const id of asked) lacking.add(id);
			}
		}
		return lacking;
	}

	/** At most once a round, when crew lines came or the crew was never heard of. Its failure fails nothing else. */
	async #refreshCrew(): Promise<void> {
		if (this.#crewAsked) return;
		if (!this.#crewChanged && (await crewOf(this.#store, this.#build)).length > 0) return;
		this.#crewAsked = true;
		try {
			await keepCrew(this.#store, this.#build, await this.#transport.crew(this.#build));
		} catch (error) {
			if (sessionOutcome(error)) throw error;
		}
	}
}

function digestOf(keys: readonly { readonly id: string }[]): string {
	return hashText(keys.map(({ id }) => id).join());
}

function statusOf(error: unknown): number | undefined {
	return error instanceof Refused || error instanceof Unreachable ? error.status : undefined;
}

function isTimeout(error: unknown): boolean {
	return error instanceof Unreachable && error.reason === 'timeout';
}

/** May fewer lines at once fare better? A full disk or a server that is starting fares no better with one. */
function isForSmaller(error: unknown): boolean {
	if (isTimeout(error)) return true;
	const status = statusOf(error);
	if (status === 413) return true;
	return status !== undefined && status >= 500 && status !== 503 && status !== 507;
}
