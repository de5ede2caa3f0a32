import type { Place } from '$lib/logbook/chain';
import { MOST_BYTES } from '$lib/logbook/entry';
import { isCrewEntry } from '$lib/logbook/fold/crew';
import { N_LEAP } from '$lib/logbook/judge';
import type { RefusalCode } from '$lib/logbook/refusals';
import type { PushAnswer, PushRequest, PushResult } from '$lib/logbook/wire';
import type { Trx } from '../db';
import { log as processLog } from '../logger';
import { DiskFullError, write } from '../write';
import { Journal } from './journal';
import type { LogServer } from './log-server';
import { Batch, referents } from './offered';
import type { Line, Offered } from './offered';
import { writeServerLines } from './server-lines';
import {
	enrolmentRefusal,
	isForLater,
	isForOwner,
	refusedReferent,
	settle,
	verdict
} from './verdict';

/** Refused lines kept for one carrier in one build: what can never be accepted, and what the owner may accept. */
const MOST_BROKEN = 2000;
const MOST_FOR_OWNER = 20_000;

type Outcome = Omit<PushResult, 'id'>;
interface Taken {
	readonly place: Place;
	readonly maxN: number;
	readonly results: PushResult[];
	readonly mint: boolean;
}

/**
 * Takes the lines a person offers for a build. Each gets a result of its own; one that is refused does not touch the
 * others. When this returns, everything answered as accepted, duplicate, held or pending is on the disk.
 *
 * @param actor the person of the session: who carries the lines, not who wrote them
 * @throws DiskFullError, and whatever else keeps the database from writing; then nothing of the call may be taken as
 *   kept, and the device offers it again
 */
export async function push(
	server: LogServer,
	actor: string,
	build: string,
	request: PushRequest
): Promise<PushAnswer | RefusalCode> {
	const { db, key } = server;
	// Before any line is read: a stranger's request costs one look.
	if (await isStranger(server, actor, build, request)) return 'build.unknown';
	const batch = new Batch(key, build, request);
	let taken: Taken | RefusalCode;
	try {
		taken = await write(db, (trx) => takeBatch(trx, server, actor, request, batch, batch.lines));
	} catch (error) {
		if (isOfDatabase(error)) throw error;
		processLog().error({ err: error, build }, 'a batch failed, its lines are taken one by one');
		taken = await takeOneByOne(server, actor, request, batch);
	}
	if (typeof taken === 'string') return taken;
	server.live.headMoved(build, taken.place.seq);
	return {
		cursor: key.signPlace(build, taken.place),
		maxN: taken.maxN,
		results: taken.results,
		...(taken.mint && { mint: true })
	};
}

/** Not in the crew, never was, and with nothing in hand that could make a difference. */
async function isStranger(
	{ db, key }: LogServer,
	actor: string,
	build: string,
	{ proofs = [], seals, entries }: PushRequest
): Promise<boolean> {
	const row = await db
		.selectFrom('build')
		.leftJoin('member', (join) =>
			join.onRef('member.build', '=', 'build.id').on('member.person', '=', actor)
		)
		.select(['build.id', 'member.person'])
		.where('build.id', '=', build)
		.executeTakeFirst();
	if (row?.person != null) return false;
	if (row === undefined) return !entries.some((text) => text.includes(`"id":"${build}"`));
	return proofs.length === 0 && !seals.some((seal) => seal.device === key.device);
}

/** Trouble of the disk or the lock, not of a line: taking the lines singly would only meet it again. */
function isOfDatabase(error: unknown): boolean {
	if (error instanceof DiskFullError) return true;
	const code = error instanceof Error && 'code' in error ? String(error.code) : '';
	return /^SQLITE_(BUSY|IOERR|FULL|READONLY|CANTOPEN|CORRUPT|NOTADB)/.test(code);
}

/**
 * After a failure nobody foresaw: what comes before the line that causes it is kept, so that the device, which halves
 * its batches, ends up with that line alone.
 */
async function takeOneByOne(
	server: LogServer,
	actor: string,
	request: PushRequest,
	batch: Batch
): Promise<Taken | RefusalCode> {
	let last: Taken | undefined;
	const results: PushResult[] = [];
	for (const line of batch.lines) {
		const taken = await write(server.db, (trx) =>
			takeBatch(trx, server, actor, request, batch, [line])
		);
		if (typeof taken === 'string') return taken;
		results.push(...taken.results);
		last = { ...taken, results, mint: taken.mint || last?.mint === true };
	}
	return last ?? 'request.internal';
}

async function takeBatch(
	trx: Trx,
	server: LogServer,
	actor: string,
	request: PushRequest,
	batch: Batch,
	lines: readonly Offered[]
): Promise<Taken | RefusalCode> {
	let journal = await Journal.open(trx, batch.build);
	let opening: Line | undefined;
	if (!journal) {
		opening = batch.opening(actor);
		if (!opening || !mayBegin(opening, batch)) return 'build.unknown';
		if (request.cursor.seq !== 0) return 'history.differs';
		journal = await Journal.begin(trx, batch.build);
	} else if (!journal.member(actor) && !batch.hasProof) {
		return 'build.unknown';
	} else if (!(await journal.standsAt(request.cursor))) {
		return 'history.differs';
	}

	const wanted: string[] = [];
	const devices: string[] = [];
	for (const { id, entry } of lines) {
		if (id !== null) wanted.push(id);
		if (!entry) continue;
		wanted.push(...referents(entry));
		devices.push(entry.device);
	}
	await journal.lookUp(wanted);
	if (lines.some(({ entry }) => isCrewEntry(entry) || entry?.kind === 'build.opened'))
		await journal.loadCrew();
	await journal.lookUpDevices(devices);

	const taking = new Taking(server, journal, batch, actor, request.device);
	if (opening) taking.open(opening);
	const outcomes: Outcome[] = [];
	for (const line of lines) outcomes.push(await taking.take(line));
	await settle(journal, taking.moved);
	const mint = await taking.usesNumberTwice();
	await journal.flush();
	return {
		place: journal.place,
		maxN: journal.maxN,
		mint,
		results: lines.map((line, i) => ({
			id: line.id,
			...settled(journal, line, outcomes[i] as Outcome)
		}))
	};
}

function mayBegin(opening: Line, batch: Batch): boolean {
	return opening.entry.n <= N_LEAP || batch.isProven(opening);
}

/** What became of a line that was held when it was taken and may have been released by a later one. */
function settled(journal: Journal, { id, hash }: Offered, outcome: Outcome): Outcome {
	if (outcome.status !== 'held' || id === null) return outcome;
	if (journal.find(id)?.hash === hash) return { status: 'accepted' };
	const refused = journal.quarantined(id, hash);
	return refused ? { status: 'refused', code: refused.code } : outcome;
}

/** One push being taken, line by line. */
class Taking {
	readonly #server: LogServer;
	readonly #journal: Journal;
	readonly #batch: Batch;
	readonly #actor: string;
	readonly #device: string;
	/** The n of the lines of the pushing device that are new. */
	readonly #numbers: number[] = [];
	/** Lines the actor has in quarantine, once counted. */
	#quarantined: number | undefined;
	#opened: string | undefined;
	/** Lines that others may have waited for. */
	readonly moved = new Set<string>();

	constructor(server: LogServer, journal: Journal, batch: Batch, actor: string, device: string) {
		this.#server = server;
		this.#journal = journal;
		this.#batch = batch;
		this.#actor = actor;
		this.#device = device;
	}

	/** Begins the build with its first line; its author is the owner from here on. */
	open(line: Line): void {
		const key = this.#batch.keyOf(line.entry.device) as string;
		const seal = this.#batch.sealOf(line, key);
		if (!seal) throw new Error('a build begins with a sealed line');
		this.#journal.append({ ...line, seal: this.#journal.keepSeal(seal) });
		this.#opened = line.entry.id;
		// One that was lost has these lines already; the devices that know them offer them again.
		if (this.#batch.isProven(line)) return;
		writeServerLines(this.#server.key, this.#journal, line.entry.author, [
			{ kind: 'crew.joined', body: { person: line.entry.author, role: 'owner' } }
		]);
	}

	async take(line: Offered): Promise<Outcome> {
		const { id, hash } = line;
		const journal = this.#journal;
		if (line.code !== undefined && line.code !== 'entry.unknown_kind')
			return this.#refuse(line, line.code);
		if (id === null) throw new Error('a line that can be read has an id');
		const build = line.entry ? line.entry.build : line.build;
		if (build !== undefined && build !== journal.build)
			return this.#refuse(line, 'entry.wrong_build');

		const accepted = journal.find(id);
		if (accepted) {
			if (accepted.hash !== hash) return this.#refuse(line, 'entry.id_conflict');
			// The line that began the build was appended before all others.
			if (id !== this.#opened) return { status: 'duplicate' };
			this.#opened = undefined;
			return { status: 'accepted' };
		}
		if (line.code !== undefined) return this.#refuse(line, line.code);

		const proven = this.#batch.isProven(line);
		const kept = journal.quarantined(id, hash);
		if (kept?.decision === 'discarded' && isForOwner(kept.code) && !proven)
			return { status: 'discarded' };

		const seal = this.#sealBrought(line) ?? (await this.#sealFor(line));
		if (seal === 'device.unknown') {
			const judgement = verdict(line.entry, journal);
			const code = judgement.verdict === 'refuse' && !proven ? judgement.code : seal;
			return this.#refuse(line, this.#unlessCarriedHome(code));
		}
		if (seal === 'seal.broken' || seal === 'seal.missing') return this.#refuse(line, seal);

		const code =
			proven || line.entry.kind !== 'device.enrolled'
				? undefined
				: await enrolmentRefusal(line.entry, this.#actor, journal);
		if (code) return this.#refuse(line, this.#unlessCarriedHome(code), seal);
		const judgement = proven ? ({ verdict: 'accept' } as const) : verdict(line.entry, journal);
		switch (judgement.verdict) {
			case 'accept':
				journal.append({ ...line, seal });
				this.moved.add(id);
				this.#countNumber(line);
				return { status: 'accepted' };
			case 'hold': {
				const held = journal.held(id, hash);
				if (journal.isHeldOtherwise(id, hash)) return this.#refuse(line, 'entry.id_conflict', seal);
				if (!held) this.#countNumber(line);
				journal.hold({ ...line, seal }, this.#actor, judgement.waitsFor);
				return { status: 'held' };
			}
			case 'refuse': {
				const { entry } = line;
				// The carrier's own device under another's name; or, honestly, another's device.
				const forged =
					judgement.code === 'device.other_person' &&
					journal.enrolledFor(entry.device) === this.#actor;
				const refused = forged ? 'entry.forged_author' : judgement.code;
				return this.#refuse(line, this.#unlessCarriedHome(refused), seal);
			}
		}
	}

	#countNumber({ entry }: Line): void {
		if (entry.device === this.#device) this.#numbers.push(entry.n);
	}

	/** Name of the seal that came with this line, where its device is known: nearly always, and nothing is waited for. */
	#sealBrought(line: Line): string | undefined {
		const key = this.#journal.device(line.entry.device)?.key;
		const seal = key === undefined ? undefined : this.#batch.sealOf(line, key);
		return seal && this.#journal.keepSeal(seal);
	}

	/** Name of a sound seal over this line, or why there is none. */
	async #sealFor(line: Line): Promise<string> {
		const { entry, hash } = line;
		const { id, device } = entry;
		const journal = this.#journal;
		const enrolled = journal.device(device)?.key;
		// A false enrolment that came first must not break the seals of the true device.
		const keys =
			enrolled === undefined
				? [
						...(entry.kind === 'device.enrolled' ? [entry.body.key] : []),
						this.#batch.keyOf(device) ?? [],
						...journal.refusedDevices(device).map((refused) => refused.key)
					].flat()
				: [enrolled];
		for (const key of keys) {
			const seal = this.#batch.sealOf(line, key);
			if (seal) return journal.keepSeal(seal);
			// One that came with these bytes before.
			for (const kept of [journal.held(id, hash), journal.quarantined(id, hash)])
				if (kept?.seal != null && (await journal.isSealedBy(key, device, hash, kept.seal)))
					return kept.seal;
		}
		const [key] = keys;
		return key === undefined ? 'device.unknown' : this.#batch.sealRefusal(line, key);
	}

	/**
	 * After a restore the crew line of the carrier may be among what was lost, and arrive a push later: until the carrier
	 * is known, nothing is said about authors that could not be taken back.
	 */
	#unlessCarriedHome(code: RefusalCode): RefusalCode {
		const unknown = code === 'entry.author_unknown' && !this.#journal.member(this.#actor);
		return unknown ? 'device.unknown' : code;
	}

	/** Answers a line that was refused, and keeps it for the owner where it is worth or safe to keep. */
	async #refuse(line: Offered, code: RefusalCode, seal: string | null = null): Promise<Outcome> {
		const refused = { status: 'refused', code } as const;
		const { id, hash, entry } = line;
		if (id === null || isForLater(code)) return refused;
		const journal = this.#journal;
		const kept = journal.quarantined(id, hash);
		const forOwner = isForOwner(code);
		const standsOn =
			code === 'entry.referent_refused' && entry ? refusedReferent(entry, journal) : null;
		if (kept) {
			if (kept.decision === 'discarded') return { status: 'discarded' };
			// Who else brings an enrolment takes nothing back that its author's own session said.
			if (code === 'device.carried' && kept.carrier === entry?.author) return refused;
			const carrier = entry?.author === this.#actor ? this.#actor : kept.carrier;
			// It may have come with a sound seal only now, be refused for another reason, or come from its author.
			if (kept.code !== code || kept.seal !== seal || kept.carrier !== carrier)
				journal.quarantine({
					...kept,
					carrier,
					text: kept.text ?? this.#textToKeep(line, code),
					seal: seal ?? kept.seal,
					code,
					stands_on: standsOn
				});
			return forOwner ? { status: 'pending', code } : refused;
		}
		if (!(await this.#hasRoom(forOwner))) return refused;
		journal.quarantine({
			id,
			hash,
			text: this.#textToKeep(line, code),
			seal,
			carrier: this.#actor,
			code,
			stands_on: standsOn
		});
		// What waited for it follows it; so does what comes after it in this push.
		if (!journal.find(id)) this.moved.add(id);
		return refused;
	}

	/** Null for what is not this build's business, and for what is too large to be kept for looking at only. */
	#textToKeep({ text }: Offered, code: RefusalCode): string | null {
		if (code === 'entry.wrong_build') return null;
		return isForOwner(code) || Buffer.byteLength(text) <= MOST_BYTES ? text : null;
	}

	/** One carrier cannot fill the quarantine, and somebody who never was in the crew can put nothing broken there. */
	async #hasRoom(forOwner: boolean): Promise<boolean> {
		if (!forOwner && !this.#journal.member(this.#actor)) return false;
		this.#quarantined ??= await this.#journal.quarantinedBy(this.#actor);
		if (this.#quarantined >= (forOwner ? MOST_FOR_OWNER : MOST_BROKEN)) return false;
		this.#quarantined++;
		return true;
	}

	/** Has this device given out an n twice? Then two stores use its id. Asked before anything is written. */
	usesNumberTwice(): Promise<boolean> {
		const fresh = new Set(this.#numbers);
		if (fresh.size < this.#numbers.length) return Promise.resolve(true);
		return this.#journal.usedN(this.#device, this.#numbers);
	}
}
