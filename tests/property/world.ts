/**
 * A crew with phones and a server, driven by a script of mishaps: the real device store (on fake-indexeddb), the real
 * rounds of sync, the real server functions on a real SQLite file. Between them a network that loses, doubles and delays.
 */
import 'fake-indexeddb/auto';
import { openDB } from 'idb';
import { appendEntries, type Draft } from '../../src/lib/device/append';
import { exportBuild, importExport } from '../../src/lib/device/exchange';
import {
	builds,
	foldedBuild,
	foldedSeam,
	linesOfPart,
	outboxRows,
	summaries
} from '../../src/lib/device/read';
import { syncRound } from '../../src/lib/device/round';
import { openStore, storeName, type DeviceStore } from '../../src/lib/device/store';
import { Refused, Unreachable, type Transport } from '../../src/lib/device/transport';
import { readEntry, type Entry } from '../../src/lib/logbook/entry';
import { foldBuild } from '../../src/lib/logbook/fold/build';
import { lineOf, type Line } from '../../src/lib/logbook/fold/line';
import { foldSeam, headsAt, rangesOf, type Hole } from '../../src/lib/logbook/fold/seam';
import { summarise } from '../../src/lib/logbook/fold/summary';
import type { Role } from '../../src/lib/logbook/kinds';
import { isRefusalCode, refusal } from '../../src/lib/logbook/refusals';
import { HaveRequest, PushRequest, type PushAnswer } from '../../src/lib/logbook/wire';
import { myBuilds } from '../../src/lib/server/log/builds';
import { addMember, changeRole, readCrew, removeMember } from '../../src/lib/server/log/crew';
import { have, pull } from '../../src/lib/server/log/pull';
import { push } from '../../src/lib/server/log/push';
import { decideQuarantine, listQuarantine } from '../../src/lib/server/log/quarantine';
import { TestLogServer } from '../support/log-server';
import { makeId } from '../support/people';

/** What the network does to one call. */
export type Mishap = 'none' | 'lost' | 'answer lost' | 'twice' | 'write between' | 'server fails';

export interface Person {
	readonly id: string;
	readonly name: string;
	readonly email: string;
	readonly role: Role;
}

/** Real time of the first schedule; devices add their own error to it. */
const EPOCH = Date.UTC(2026, 2, 14, 19);
const YEAR = 365 * 86_400_000;
let worlds = 0;

export class Phone {
	/** How wrong its clock is, in ms. */
	wrong = 0;
	/** What happens to its next calls; an empty list is a good network. */
	mishaps: Mishap[] = [];
	/** Lines per page, so that even short histories are pulled in pages. */
	page = 4;
	/** Called between the calls of a round. */
	between: (() => Promise<void>) | undefined;

	constructor(
		readonly person: Person,
		readonly prefix: string,
		public store: DeviceStore
	) {}
}

export class World {
	readonly phones: Phone[] = [];
	readonly seams: string[] = [];
	build = '';
	/** Every line any server acknowledged, by id: its hash. */
	readonly acknowledged = new Map<string, string>();
	/** Every line any phone called saved, by id: its text. */
	readonly saved = new Map<string, string>();
	/** Phones that are no more. */
	lost = 0;
	/** Lines on which the server fails whole, until healed. */
	readonly poison = new Set<string>();
	/** Enrolments whose author was handed a file with them. */
	readonly #handed = new Set<string>();
	#tick = 0;
	#prefix = `world ${++worlds}: `;

	private constructor(
		readonly server: TestLogServer,
		readonly people: readonly Person[]
	) {}

	/** @param roles of the crew beside the owner */
	static async make(roles: readonly Exclude<Role, 'owner'>[]): Promise<World> {
		const server = await TestLogServer.make();
		const people = (['owner', ...roles] as Role[]).map((role, i): Person => {
			const id = makeId();
			return { id, name: `Person ${i}`, email: `p${i}.${id}@example.org`, role };
		});
		for (const { id, name, email } of people) await server.addAccount(id, name, email);
		const world = new World(server, people);
		for (const person of people) await world.addPhone(person);
		const [owner] = world.phones as [Phone];
		world.build = owner.store.newId();
		const assembly = owner.store.newId();
		world.seams.push(owner.store.newId(), owner.store.newId());
		await world.append(owner, [
			{ id: world.build, kind: 'build.opened', body: { name: 'Yarrow Two' } },
			{ id: assembly, kind: 'assembly.planned', assembly, body: { name: 'Left elevator' } },
			...world.seams.map((seam, i): Draft => ({
				id: seam,
				kind: 'seam.planned',
				seam,
				body: { name: `Seam ${i}`, assembly, holes: { count: 8, first: 1 } }
			}))
		]);
		await world.sync(owner);
		for (const person of people.slice(1)) await world.admit(person);
		for (const phone of world.phones) await world.sync(phone);
		// So that a restore before the first backup of the script goes back to here.
		await server.backUp();
		return world;
	}

	async addPhone(person: Person): Promise<Phone> {
		const prefix = `${this.#prefix}${this.phones.length}: `;
		const phone = new Phone(person, prefix, undefined as unknown as DeviceStore);
		phone.store = await this.#open(phone);
		this.phones.push(phone);
		return phone;
	}

	#open(phone: Phone): Promise<DeviceStore> {
		return openStore(phone.person.id, {
			prefix: phone.prefix,
			env: { now: () => EPOCH + ++this.#tick * 1000 + phone.wrong, offset: () => 60 }
		});
	}

	/** Time passes: whatever waits for a later try is due. */
	passTime(): void {
		this.#tick += 100_000;
	}

	async close(): Promise<void> {
		for (const phone of this.phones) {
			phone.store.close();
			indexedDB.deleteDatabase(storeName(phone.person.id, phone.prefix));
		}
		await this.server.close();
	}

	// ---- what people do -------------------------------------------------------------------------------------

	async append(phone: Phone, drafts: readonly Draft[]): Promise<readonly Entry[]> {
		const entries = await appendEntries(phone.store, this.build, drafts);
		for (const line of await this.#texts(
			phone,
			entries.map(({ id }) => id)
		))
			this.saved.set(...line);
		return entries;
	}

	async #texts(phone: Phone, ids: readonly string[]): Promise<[string, string][]> {
		return phone.store.handle.run(async (db) => {
			const rows = await Promise.all(ids.map((id) => db.get('entries', [this.build, id])));
			return rows.map((row): [string, string] => [row?.id ?? '', row?.text ?? '']);
		});
	}

	/** Somebody does something at the bench. Does nothing where it makes no sense, or the phone may not write. */
	async work(
		phone: Phone,
		what: Work,
		seamNumber: number,
		from: number,
		size: number
	): Promise<void> {
		const here = (await builds(phone.store)).find(({ build }) => build === this.build);
		if (!here || here.removed) return;
		const seam = this.seams[seamNumber % this.seams.length] as string;
		const folded = await foldedSeam(phone.store, this.build, seam);
		if (!folded.planned) return;
		const holes = folded.holes.filter(({ number = 99 }) => from <= number && number <= from + size);
		if (holes.length === 0) return;
		const drafts = draftsOf(what, seam, holes, folded.lines, phone.store);
		const allowed =
			phone.person.role !== 'follower' || drafts.every(({ kind }) => kind === 'note.written');
		if (drafts.length > 0 && allowed) await this.append(phone, drafts);
	}

	/** The phone’s counter runs away by millions, as after a bug or an attack. */
	async countWildly(phone: Phone): Promise<void> {
		await phone.store.handle.run(async (db) => {
			const tx = db.transaction('builds', 'readwrite');
			const row = await tx.store.get(this.build);
			if (row) await tx.store.put({ ...row, maxN: row.maxN + 2_000_000 });
			await tx.done;
		});
	}

	async reopen(phone: Phone): Promise<void> {
		phone.store.close();
		phone.store = await this.#open(phone);
	}

	/** A second phone from a copied profile: the same lines, the same keys, the same device id. */
	async clone(phone: Phone): Promise<void> {
		if (this.phones.length >= 7) return;
		const copy = await this.addPhone(phone.person);
		copy.wrong = phone.wrong;
		copy.store.close();
		const from = await openDB(storeName(phone.person.id, phone.prefix));
		const to = await openDB(storeName(copy.person.id, copy.prefix));
		for (const name of from.objectStoreNames) {
			const [keys, values] = await Promise.all([from.getAllKeys(name), from.getAll(name)]);
			const tx = to.transaction(name, 'readwrite');
			await tx.store.clear();
			const inline = tx.store.keyPath !== null;
			await Promise.all(
				values.map((value, i) => (inline ? tx.store.put(value) : tx.store.put(value, keys[i])))
			);
			await tx.done;
		}
		from.close();
		to.close();
		copy.store = await this.#open(copy);
	}

	/** A phone is lost or wiped; what only it knew is gone, what others carry is not. */
	lose(phone: Phone): void {
		// The owner keeps one: somebody has to decide about what was refused.
		const others = this.phones.filter((other) => other !== phone);
		if (others.length < 2 || !others.some((other) => other.person.role === 'owner')) return;
		this.phones.splice(this.phones.indexOf(phone), 1);
		phone.store.close();
		this.lost++;
	}

	/** A file from one phone to another, of whomever. */
	async handOver(from: Phone, to: Phone): Promise<void> {
		if (!(await builds(from.store)).some(({ build }) => build === this.build)) return;
		const { text } = await exportBuild(from.store, this.build);
		await importExport(to.store, text);
	}

	async remove(person: Person): Promise<void> {
		if (person.role === 'owner') return;
		await removeMember(this.server, this.#owner, this.build, person.id);
	}

	async admit(person: Person): Promise<void> {
		if (person.role === 'owner') return;
		await addMember(this.server, this.#owner, this.build, person.email, person.role);
	}

	async changeRole(person: Person, role: Role): Promise<void> {
		if (person.role === 'owner' || role === 'owner') return;
		await changeRole(this.server, this.#owner, this.build, person.id, role);
	}

	get #owner(): string {
		return (this.people[0] as Person).id;
	}

	// ---- the network ----------------------------------------------------------------------------------------

	async sync(phone: Phone, tryNow = false): Promise<void> {
		await syncRound(phone.store, this.#transport(phone), { tryNow });
	}

	#transport(phone: Phone): Transport {
		const actor = phone.person.id;
		const { server } = this;
		const call = async <T>(work: () => Promise<T | string>): Promise<T> => {
			const mishap = phone.mishaps.shift() ?? 'none';
			if (mishap === 'lost') throw new Unreachable('network');
			if (mishap === 'server fails') throw new Unreachable('server', 500, 'request.internal');
			if (mishap === 'write between') await phone.between?.();
			let answer = await work();
			if (mishap === 'twice') answer = await work();
			if (mishap === 'answer lost') throw new Unreachable('timeout');
			if (typeof answer === 'string')
				throw new Refused(isRefusalCode(answer) ? (refusal(answer).status ?? 400) : 400, answer);
			return JSON.parse(JSON.stringify(answer)) as T;
		};
		return {
			builds: async () => (await call(() => myBuilds(server, actor))).builds,
			pull: (build, after) =>
				call(() =>
					pull(server, actor, build, { after: after.seq, link: after.link, limit: phone.page })
				),
			push: (build, request) => {
				// As over the wire: only what the message carries arrives.
				const message = PushRequest.parse(JSON.parse(JSON.stringify(request)));
				return call(async () => {
					const ids = message.entries.map((text) => (JSON.parse(text) as { id: string }).id);
					if (ids.some((id) => this.poison.has(id)))
						throw new Unreachable('server', 500, 'request.internal');
					const answer = await push(server, actor, build, message);
					if (typeof answer !== 'string') this.#note(message, answer);
					return answer;
				});
			},
			have: async (build, ids) =>
				(await call(() => have(server, actor, build, HaveRequest.parse({ ids })))).lacking,
			crew: async (build) => (await call(() => readCrew(server, actor, build))).crew,
			quarantine: async (build) => (await call(() => listQuarantine(server, actor, build))).lines,
			decide: async (build, ids, decision) =>
				(await call(() => decideQuarantine(server, actor, build, { ids, decision }))).results,
			live: () => () => undefined
		};
	}

	/** Whatever the server promised counts from here on, also when the phone never hears of it. */
	#note(message: PushRequest, answer: PushAnswer): void {
		for (const [i, { id, status }] of answer.results.entries()) {
			if (id === null || !['accepted', 'duplicate', 'held'].includes(status)) continue;
			const reading = readEntry(message.entries[i] as string);
			if (reading.ok) this.acknowledged.set(id, reading.hash);
		}
	}

	// ---- the end --------------------------------------------------------------------------------------------

	async acceptQuarantine(later = false): Promise<number> {
		// An hour from now: also what has been held for a line that does not come.
		const list = await listQuarantine(
			this.server,
			this.#owner,
			this.build,
			later ? Date.now() + 3_600_000 : undefined
		);
		if (typeof list === 'string') throw new Error(list);
		const ids = list.lines.filter(({ acceptable }) => acceptable).map(({ id }) => id);
		for (let i = 0; i < ids.length; i += 200)
			await decideQuarantine(this.server, this.#owner, this.build, {
				ids: ids.slice(i, i + 200),
				decision: 'accept'
			});
		return ids.length;
	}

	/** Everybody is back in the crew, the network is good, time passes: rounds until nothing moves any more. */
	async heal(): Promise<void> {
		this.poison.clear();
		for (const phone of this.phones) {
			phone.mishaps = [];
			phone.between = undefined;
			phone.page = 1000;
		}
		let before = '';
		let quiet = false;
		for (let round = 0; round < 20; round++) {
			this.passTime();
			for (const phone of this.phones) await this.sync(phone);
			for (const person of this.people) await this.admit(person);
			await this.acceptQuarantine(quiet);
			const now = await this.#state();
			if (now === before && quiet && !(await this.#handHome())) return;
			// Once nothing moves by itself, the owner also looks at what has long been held.
			quiet ||= now === before;
			before = now;
		}
		throw new Error(`still moving after twenty rounds: ${before}`);
	}

	/**
	 * An enrolment comes in with the session of its author and no other. Whoever carries one whose phone is lost hands
	 * its author a file, on a new phone if need be.
	 * @returns whether anybody was handed one
	 */
	async #handHome(): Promise<boolean> {
		let handed = false;
		for (const phone of [...this.phones])
			for (const { id, code } of await this.outbox(phone)) {
				const entry = await phone.store.handle.run((db) => db.get('entries', [this.build, id]));
				const author = this.people.find((person) => person.id === entry?.author);
				if (code !== 'device.carried' || !author || this.#handed.has(id)) continue;
				this.#handed.add(id);
				const own = this.phones.find(({ person }) => person === author);
				await this.handOver(phone, own ?? (await this.addPhone(author)));
				handed = true;
			}
		return handed;
	}

	async #state(): Promise<string> {
		const parts: unknown[] = [await this.server.verifyChain(this.build)];
		for (const phone of this.phones) {
			const rows = await outboxRows(phone.store, this.build);
			const row = (await builds(phone.store)).find(({ build }) => build === this.build);
			parts.push(
				row?.cursor,
				row?.lines,
				rows.map(({ state, id }) => `${state} ${id}`)
			);
		}
		return JSON.stringify(parts);
	}

	/** Ids of all lines that still exist anywhere: on a phone, in the log, or beside it. */
	async existing(): Promise<Set<string>> {
		const ids = new Set((await this.accepted()).keys());
		const { held, quarantined } = await this.aside();
		for (const id of [...held, ...quarantined.keys()]) ids.add(id);
		for (const phone of this.phones)
			for (const id of await phone.store.handle.run((db) => db.getAllKeys('entries')))
				ids.add(id[1]);
		return ids;
	}

	/** For the message of a failure. */
	async whereIs(id: string): Promise<string> {
		const { held, quarantined } = await this.aside();
		const places = [
			`lost: ${id}`,
			held.has(id) ? 'held' : '',
			`quarantine ${quarantined.get(id) ?? '-'}`
		];
		for (const phone of this.phones) {
			const entry = await phone.store.handle.run((db) => db.get('entries', [this.build, id]));
			const row = (await this.outbox(phone)).find((there) => there.id === id);
			const {
				author = '',
				device = '',
				kind = '',
				seq = 0,
				history = 0,
				finding = ''
			} = entry ?? {};
			places.push(
				`${phone.person.name}: ${entry ? `${kind} by ${author} on ${device}, ${seq} of history ${history} ${finding}` : 'not here'}, ${row?.state ?? 'no row'} ${row?.code ?? ''}`
			);
		}
		return places.join('\n');
	}

	/** All accepted lines, as the server has them on its disk. */
	async accepted(): Promise<Map<string, { text: string; hash: string }>> {
		const rows = await this.server.db
			.selectFrom('entry')
			.select(['id', 'text', 'hash'])
			.where('build', '=', this.build)
			.execute();
		return new Map(rows.map(({ id, ...row }) => [id, row]));
	}

	/** Ids of what is kept beside the log: held, or refused and kept for the owner. */
	async aside(): Promise<{ held: Set<string>; quarantined: Map<string, string> }> {
		const held = await this.server.db.selectFrom('held').select('id').execute();
		const quarantined = await this.server.db
			.selectFrom('quarantine')
			.select(['id', 'code'])
			.execute();
		return {
			held: new Set(held.map(({ id }) => id)),
			quarantined: new Map(quarantined.map(({ id, code }) => [id, code]))
		};
	}

	/** What a phone and the server each make of a seam and of the build, to be compared whole. */
	static foldsOfTexts(texts: Iterable<string>, seams: readonly string[]) {
		const lines = [...texts].map((text) => lineOf(readEntry(text)) as Line);
		return {
			build: foldBuild(lines.filter(({ envelope }) => envelope.seam === undefined)),
			seams: seams.map((seam) =>
				foldSeam(
					seam,
					lines.filter(({ envelope }) => envelope.seam === seam)
				)
			),
			summaries: seams.map((seam) =>
				summarise(
					foldSeam(
						seam,
						lines.filter(({ envelope }) => envelope.seam === seam)
					)
				)
			)
		};
	}

	async foldsOf(phone: Phone) {
		const sums = await summaries(phone.store, this.build);
		return {
			build: await foldedBuild(phone.store, this.build),
			seams: await Promise.all(this.seams.map((seam) => foldedSeam(phone.store, this.build, seam))),
			summaries: this.seams.map((seam) => sums.find((summary) => summary.seam === seam))
		};
	}

	/** Ids a phone counts. */
	async counted(phone: Phone): Promise<Set<string>> {
		const parts = await Promise.all(
			['', ...this.seams].map((part) => linesOfPart(phone.store, this.build, part))
		);
		return new Set(parts.flat().map(({ id }) => id));
	}

	async outbox(phone: Phone) {
		return outboxRows(phone.store, this.build);
	}

	wrongClock(phone: Phone, years: number): void {
		phone.wrong = years * YEAR;
	}
}

export const WORK = [
	'drive',
	'drive',
	'drive',
	'leave',
	'drill',
	'note',
	'defect',
	'fix',
	'plan',
	'add',
	'undo',
	'settle',
	'strike'
] as const;
export type Work = (typeof WORK)[number];

function draftsOf(
	what: Work,
	seam: string,
	holes: readonly Hole[],
	lines: readonly Line[],
	store: DeviceStore
): Draft[] {
	const on = headsAt(holes);
	const named = rangesOf(holes);
	const last = [...lines].reverse();
	const struck = (line: Line | undefined): Draft[] =>
		line ? [{ kind: 'entry.struck', seam, body: { entry: line.id, reason: 'undo' } }] : [];
	switch (what) {
		case 'drive':
			return [{ kind: 'holes.driven', seam, on, body: { holes: named, method: 'driven' } }];
		case 'leave':
			return [
				{ kind: 'holes.left_open', seam, on, body: { holes: named, reason: 'nutplate follows' } }
			];
		case 'drill': {
			const id = store.newId();
			return [
				{ id, kind: 'holes.drilled_out', seam, on, body: { holes: named } },
				{ kind: 'holes.driven', seam, on: [id], body: { holes: named, method: 'driven' } }
			];
		}
		case 'note':
			return [{ kind: 'note.written', seam, body: { text: 'Good light tonight.', holes: named } }];
		case 'defect':
			return [{ kind: 'defect.noted', seam, on, body: { holes: named, fault: 'tipped' } }];
		case 'fix': {
			const defect = last.find((line) => line.entry?.kind === 'defect.noted');
			if (!defect) return [];
			return [
				{
					kind: 'defect.fixed',
					seam,
					on: [defect.id],
					body: { defect: defect.id, holes: named, action: 'left_as_is' }
				}
			];
		}
		case 'plan':
			return [
				{
					kind: 'seam.changed',
					seam,
					on: [seam],
					body: { note: `Revised by ${store.device.slice(-4)}`, people: 2 }
				}
			];
		case 'add':
			return [
				{
					kind: 'holes.added',
					seam,
					body: { count: 1, first: 100 + lines.length, after: { index: 1 } }
				}
			];
		case 'undo':
			return struck(
				last.find(
					(line) => line.entry?.author === store.person && line.entry.kind.startsWith('holes.')
				)
			);
		case 'strike':
			return struck(last.find((line) => line.entry?.kind === 'holes.driven'));
		case 'settle': {
			const twice = holes.find(({ heads }) => heads.length > 1);
			const own = twice?.heads.find(
				(id) => lines.find((line) => line.id === id)?.entry?.author === store.person
			);
			const other = twice?.heads.find((id) => id !== own);
			if (own === undefined || other === undefined) return [];
			return [
				{ kind: 'entry.struck', seam, body: { entry: own, reason: 'logged_twice', keeps: other } }
			];
		}
	}
}
