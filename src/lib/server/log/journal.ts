/**
 * One build's log inside one write transaction: what was looked up, what is to be written. Lines are judged and
 * appended in memory and reach the database in one statement per table, so that the cost of a push neither grows
 * with the log nor with the number of statements. Nothing is kept until {@link Journal.flush}.
 */
import { sql } from 'kysely';
import { canonicalText } from '$lib/logbook/bytes';
import type { Json } from '$lib/logbook/bytes';
import { next, start } from '$lib/logbook/chain';
import type { Place } from '$lib/logbook/chain';
import type { Entry } from '$lib/logbook/entry';
import { crewHeads, crewOf, isCrewEntry, spokenOf } from '$lib/logbook/fold/crew';
import type { CrewState } from '$lib/logbook/fold/crew';
import { inOrder } from '$lib/logbook/fold/line';
import type { Line as FoldLine } from '$lib/logbook/fold/line';
import { N_LEAP } from '$lib/logbook/judge';
import type { Known, Log } from '$lib/logbook/judge';
import type { Role } from '$lib/logbook/kinds';
import type { RefusalCode } from '$lib/logbook/refusals';
import { sealName, sealStatement } from '$lib/logbook/seal';
import type { Seal } from '$lib/logbook/seal';
import type { Trx } from '../db';
import { Aside } from './aside';
import { readOffered } from './offered';
import type { Line } from './offered';
import { isSignedBy } from './signatures';
import type { LogTables } from './tables';

export type Member = CrewState;
interface Device {
	readonly person: string;
	readonly key: string;
}
/** An enrolment that waits for its author's own session, or was discarded. */
export interface RefusedDevice {
	readonly line: string;
	readonly key: string;
}
export interface AcceptedLine extends Known {
	readonly hash: string;
}
export type HeldLine = Omit<LogTables['held'], 'build'>;
export type QuarantinedLine = Omit<LogTables['quarantine'], 'build'>;

/** A line to be kept and the name of a sound seal over it. */
export interface SealedLine extends Line {
	readonly seal: string;
}

/** One list of ids as one parameter: the SQL stays the same however many there are. */
const listed = (values: Iterable<string | number>) =>
	sql<string>`(select value from json_each(${JSON.stringify([...values])}))`;

export class Journal implements Log {
	readonly #trx: Trx;
	readonly build: string;
	/** Ms since 1970; one for all lines of the transaction. */
	readonly received = Date.now();
	#place: Place;
	#maxN: number;
	#name: string;

	readonly #members = new Map<string, Member>();
	/** The crew lines and the one that opened the build, once loaded; the crew is folded from all of them. */
	#crew: FoldLine[] | undefined;
	/** Was a crew line added since the crew was last folded? */
	#crewMoved = false;
	readonly #devices = new Map<string, Device>();
	readonly #accepted = new Map<string, AcceptedLine>();
	readonly #held = new Aside<HeldLine>();
	readonly #quarantine = new Aside<QuarantinedLine>((before, now) => {
		this.#keepRefusedDevice(before, now);
	});
	/** Device → its refused enrolments by id and hash: parsed once, not for each line that asks. */
	readonly #refusedDevices = new Map<string, Map<string, RefusedDevice>>();
	/** Seals of lines beside the log, once read. */
	readonly #keptSeals = new Map<string, Seal | undefined>();
	/** Withdrawn line → the line that withdrew it. */
	readonly #withdrawn = new Map<string, string>();
	readonly #lookedUp = new Set<string>();
	/** Is anything held, in quarantine or withdrawn? In most builds never: then nobody asks for it line by line. */
	#hasAside = false;

	readonly #seals = new Map<string, Seal>();
	readonly #appended: (string | number | null)[][] = [];
	readonly #changed = {
		members: new Set<string>(),
		devices: new Set<string>(),
		/** Lines that were in the log before and lose their body. */
		bodies: new Set<string>(),
		withdrawn: new Set<string>()
	};

	private constructor(trx: Trx, build: string, place: Place, maxN: number, name: string) {
		this.#trx = trx;
		this.build = build;
		this.#place = place;
		this.#maxN = maxN;
		this.#name = name;
	}

	/** The log of a build, or undefined when the server does not know it. */
	static async open(trx: Trx, build: string): Promise<Journal | undefined> {
		// Begins with a write: the head that is read here is the head until the commit.
		const row = await trx
			.updateTable('build')
			.set((column) => ({ seq: column.ref('seq') }))
			.where('id', '=', build)
			.returning(['seq', 'link', 'max_n', 'name'])
			.returning(
				sql<0 | 1>`exists (select 1 from held where build = ${build})
					or exists (select 1 from quarantine where build = ${build})
					or exists (select 1 from withdrawn where build = ${build})`.as('aside')
			)
			.executeTakeFirst();
		if (row === undefined) return undefined;
		const journal = new Journal(trx, build, row, row.max_n, row.name);
		journal.#hasAside = row.aside === 1;
		const members = await trx
			.selectFrom('member')
			.select(['person', 'role', 'left'])
			.where('build', '=', build)
			.execute();
		for (const { person, role, left } of members)
			journal.#members.set(person, { role, left: left === 1 });
		return journal;
	}

	/** Makes the build. The caller appends its first line, and has made sure that it is not there yet. */
	static async begin(trx: Trx, build: string): Promise<Journal> {
		const place = start(build);
		const journal = new Journal(trx, build, place, 0, '');
		journal.#crew = [];
		await trx
			.insertInto('build')
			.values({
				id: build,
				seq: place.seq,
				link: place.link,
				max_n: 0,
				name: '',
				opened: journal.received
			})
			.execute();
		return journal;
	}

	get place(): Place {
		return this.#place;
	}
	get maxN(): number {
		return this.#maxN;
	}

	// ---- looking up ---------------------------------------------------------------------------------------

	/** Looks these lines up, wherever they are kept. Must come before anything is asked about them. */
	async lookUp(ids: Iterable<string>): Promise<void> {
		const wanted = [...new Set(ids)].filter((id) => !this.#lookedUp.has(id));
		if (wanted.length === 0) return;
		for (const id of wanted) this.#lookedUp.add(id);
		const list = listed(wanted);
		const accepted = await this.#trx
			.selectFrom('entry')
			.select(['id', 'hash', 'n', 'kind', 'v', 'author', 'seam', 'assembly'])
			.where('build', '=', this.build)
			.where('id', 'in', list)
			.execute();
		for (const { id, seam, assembly, ...line } of accepted) {
			this.#accepted.set(id, {
				...line,
				seam: seam ?? undefined,
				assembly: assembly ?? undefined
			});
		}
		if (!this.#hasAside) return;
		const { rows } = await sql<{ at: 'held' | 'quarantine' | 'withdrawn'; id: string; by: string }>`
			select 'held' as at, id, '' as by from held where build = ${this.build} and id in ${list}
			union all
			select 'quarantine', id, '' from quarantine where build = ${this.build} and id in ${list}
			union all
			select 'withdrawn', id, by from withdrawn where build = ${this.build} and id in ${list}
		`.execute(this.#trx);
		const aside = rows.filter((row) => row.at !== 'withdrawn').map((row) => row.id);
		for (const { at, id, by } of rows) if (at === 'withdrawn') this.#withdrawn.set(id, by);
		if (aside.length > 0) await this.#loadAside('id', aside);
	}

	async lookUpDevices(devices: Iterable<string>): Promise<void> {
		const rows = await this.#trx
			.selectFrom('device')
			.select(['device', 'person', 'key'])
			.where('build', '=', this.build)
			.where('device', 'in', listed(new Set(devices)))
			.execute();
		for (const { device, ...row } of rows) this.#devices.set(device, row);
		const unknown = [...new Set(devices)].filter((device) => !this.#devices.has(device));
		if (unknown.length > 0 && this.#hasAside) await this.lookUp(await this.#enrolmentsOf(unknown));
	}

	/** Ids of the refused enrolments of these devices. Asked only when a push brings lines of devices nobody enrolled. */
	async #enrolmentsOf(devices: readonly string[]): Promise<string[]> {
		// Canonical text has its keys side by side; what is no JSON at all cannot be asked for a field.
		const { rows } = await sql<{ id: string }>`
			select id from quarantine where build = ${this.build} and text like '%"kind":"device.enrolled"%'
				and exists (select 1 from json_each(${JSON.stringify(devices)})
					where instr(text, '"device":"' || value || '"'))
		`.execute(this.#trx);
		return rows.map(({ id }) => id);
	}

	/** The refused enrolments of a device, each with a key of its own. Its lines share the fate of one of them. */
	refusedDevices(device: string): RefusedDevice[] {
		return [...(this.#refusedDevices.get(device)?.values() ?? [])];
	}
	refusedDevice(device: string): RefusedDevice | undefined {
		return this.refusedDevices(device)[0];
	}

	#keepRefusedDevice(before: QuarantinedLine | undefined, now: QuarantinedLine | undefined): void {
		const line = now ?? before;
		// The text of one id and hash never changes, but for coming after all.
		if (!line || (now && before?.text === now.text)) return;
		if (line.text?.includes('"kind":"device.enrolled"') !== true) return;
		const { entry } = readOffered(line.text);
		if (entry?.kind !== 'device.enrolled') return;
		const of = this.#refusedDevices.get(entry.device) ?? new Map<string, RefusedDevice>();
		this.#refusedDevices.set(entry.device, of);
		if (now) of.set(`${line.id} ${line.hash}`, { line: line.id, key: entry.body.key });
		else of.delete(`${line.id} ${line.hash}`);
	}

	/**
	 * Does the seal kept with a line hold under this key? It was found sound once, but perhaps under the key of an
	 * enrolment that was refused: a line sealed with a false key must not enter by the enrolment of the true one.
	 */
	async isSealedBy(key: string, device: string, hash: string, name: string): Promise<boolean> {
		let seal = this.#seals.get(name) ?? this.#keptSeals.get(name);
		if (!seal && !this.#keptSeals.has(name)) {
			const row = await this.#trx
				.selectFrom('seal')
				.select(['device', 'hashes', 'signature'])
				.where('build', '=', this.build)
				.where('name', '=', name)
				.executeTakeFirst();
			seal = row && { ...row, hashes: JSON.parse(row.hashes) as string[] };
			this.#keptSeals.set(name, seal);
		}
		return (
			seal?.device === device &&
			seal.hashes.includes(hash) &&
			isSignedBy(key, sealStatement(this.build, device, seal.hashes), seal.signature)
		);
	}

	/** Must come before a crew line is added: the crew is folded from all of them, not from the last. */
	async loadCrew(): Promise<void> {
		if (this.#crew) return;
		// The kinds as in the index entry_crew, word for word: else the whole log would be read.
		const { rows } = await sql<{ text: string }>`
			select text from entry where build = ${this.build}
				and kind in ('crew.joined', 'crew.role', 'crew.left', 'owner.changed')
			union all
			select text from entry where build = ${this.build} and id = ${this.build}
		`.execute(this.#trx);
		this.#crew = rows.flatMap(({ text }) => {
			const { entry } = readOffered(text);
			return entry ? [foldLine(entry)] : [];
		});
	}

	/** The ids a new line of this kind stands on; `before` is written with it and not added yet. */
	crewHeads(entry: Entry, before: readonly Entry[]): string[] {
		if (!isCrewEntry(entry)) return [];
		if (!this.#crew) throw new Error('the crew was not loaded');
		return crewHeads(inOrder([...this.#crew, ...before.map(foldLine)]), spokenOf(entry));
	}

	/** The crew as its lines have it now. */
	#membersNow(): ReadonlyMap<string, Member> {
		if (!this.#crewMoved) return this.#members;
		this.#crewMoved = false;
		for (const [person, { role, left }] of crewOf(inOrder(this.#crew ?? []))) {
			const before = this.#members.get(person);
			if (before?.role === role && before.left === left) continue;
			this.#members.set(person, { role, left });
			this.#changed.members.add(person);
		}
		return this.#members;
	}

	/** Held lines and lines in quarantine, whole. What this transaction already changed is not read over. */
	async #loadAside(by: 'id' | 'cause', ids: readonly string[]): Promise<string[]> {
		if (!this.#hasAside) return [];
		const list = listed(ids);
		const held = await this.#trx
			.selectFrom('held')
			.select(['id', 'hash', 'text', 'seal', 'carrier', 'waits_for', 'received'])
			.where('build', '=', this.build)
			.where(by === 'id' ? 'id' : 'waits_for', 'in', list)
			.execute();
		for (const line of held) this.#held.load(line);
		const quarantined = await this.#trx
			.selectFrom('quarantine')
			.select([
				'id',
				'hash',
				'text',
				'seal',
				'carrier',
				'code',
				'stands_on',
				'received',
				'decision',
				'decided_by',
				'decided_at'
			])
			.where('build', '=', this.build)
			.where(by === 'id' ? 'id' : 'stands_on', 'in', list)
			.execute();
		for (const line of quarantined) this.#quarantine.load(line);
		return [...held, ...quarantined].map((line) => line.id);
	}

	/**
	 * The lines that wait for one of `causes`, or followed it into quarantine, in the order in which they may stand on
	 * each other.
	 */
	async dependants(causes: ReadonlySet<string>): Promise<(HeldLine | QuarantinedLine)[]> {
		const moved = new Set(causes);
		// What followed one refused enrolment of a device may have been sealed with the key of another.
		for (const device of this.#changed.devices)
			for (const { line } of this.refusedDevices(device)) moved.add(line);
		await this.lookUp(await this.#loadAside('cause', [...moved]));
		const held = this.#held.all().filter((line) => moved.has(line.waits_for));
		const followed = this.#quarantine
			.all()
			.filter(
				(line) =>
					line.stands_on !== null &&
					moved.has(line.stands_on) &&
					line.code === 'entry.referent_refused' &&
					line.decision === null
			);
		return [...held, ...followed];
	}

	/** Which of these n has this device used before in this build? */
	async usedN(device: string, ns: readonly number[]): Promise<boolean> {
		const row = await this.#trx
			.selectFrom('entry')
			.select('n')
			.where('build', '=', this.build)
			.where('device', '=', device)
			.where('n', 'in', sql<number>`(select value from json_each(${JSON.stringify(ns)}))`)
			.limit(1)
			.executeTakeFirst();
		return row !== undefined;
	}

	/** Is this device enrolled anywhere for another person or with another key? */
	async isEnrolledOtherwise(device: string, { person, key }: Device): Promise<boolean> {
		const row = await this.#trx
			.selectFrom('device')
			.select('device')
			.where('device', '=', device)
			.where((where) => where.or([where('person', '!=', person), where('key', '!=', key)]))
			.limit(1)
			.executeTakeFirst();
		return row !== undefined;
	}

	/** Does the server's history stand, at this place, where the caller's does? The beginning is common to all. */
	async standsAt(place: Place): Promise<boolean> {
		if (place.seq === 0) return true;
		if (place.seq === this.#place.seq) return place.link === this.#place.link;
		const row = await this.#trx
			.selectFrom('entry')
			.select('link')
			.where('build', '=', this.build)
			.where('seq', '=', place.seq)
			.executeTakeFirst();
		return row?.link === place.link;
	}

	// ---- what judge() asks ---------------------------------------------------------------------------------

	member(person: string): Member | undefined {
		return this.#membersNow().get(person);
	}
	role(person: string): Role | 'left' | undefined {
		const member = this.member(person);
		return member?.left ? 'left' : member?.role;
	}
	device(device: string): Device | undefined {
		return this.#devices.get(device);
	}
	enrolledFor(device: string): string | undefined {
		return this.#devices.get(device)?.person;
	}
	find(id: string): AcceptedLine | undefined {
		this.#mustBeLookedUp(id);
		return this.#accepted.get(id);
	}
	held(id: string, hash: string): HeldLine | undefined {
		this.#mustBeLookedUp(id);
		return this.#held.get(id, hash);
	}
	heldUnder(id: string): HeldLine[] {
		this.#mustBeLookedUp(id);
		return this.#held.under(id);
	}
	/** Are other bytes held under this id? Whichever is judged acceptable first takes the id. */
	isHeldOtherwise(id: string, hash: string): boolean {
		return this.heldUnder(id).some((line) => line.hash !== hash);
	}
	quarantined(id: string, hash: string): QuarantinedLine | undefined {
		this.#mustBeLookedUp(id);
		return this.#quarantine.get(id, hash);
	}
	quarantinedUnder(id: string): QuarantinedLine[] {
		this.#mustBeLookedUp(id);
		return this.#quarantine.under(id);
	}
	/** Was what stands under this id refused? Not while a line is held under it, whatever else came with the id. */
	isQuarantined(id: string): boolean {
		return this.quarantinedUnder(id).length > 0 && this.heldUnder(id).length === 0;
	}
	ownersInCrew(): number {
		let owners = 0;
		for (const { role, left } of this.#membersNow().values())
			if (role === 'owner' && !left) owners++;
		return owners;
	}

	/** "Not there" may only be said of what was looked for: else a line would wait for one that has arrived. */
	#mustBeLookedUp(id: string): void {
		if (!this.#lookedUp.has(id)) throw new Error(`line ${id} was not looked up`);
	}

	// ---- changing --------------------------------------------------------------------------------------------

	/** Keeps a seal that was found sound. @returns its name, for the lines it covers */
	keepSeal(seal: Seal): string {
		for (const [name, kept] of this.#seals) if (kept === seal) return name;
		const name = sealName(seal);
		this.#seals.set(name, seal);
		return name;
	}

	/** Adds a line to the end of the history, and all that follows from it. */
	append(line: SealedLine): void {
		const { entry, hash } = line;
		const seq = this.#place.seq + 1;
		this.#place = next(this.#place, { seq, received: this.received, hash });
		// A line the owner accepted although it counts wildly keeps its n, but does not pull the counter of all
		// other devices up with it: they would all be refused as too far from there on. What stands on it is as
		// far away as it is, and so comes before the owner as well.
		if (entry.n <= this.#maxN + N_LEAP) this.#maxN = Math.max(this.#maxN, entry.n);
		this.#lookedUp.add(entry.id);
		this.#accepted.set(entry.id, { ...entry, hash });
		this.#derive(entry);
		const text = this.#withdrawn.has(entry.id) ? envelopeOf(line.text) : line.text;
		this.#appended.push([
			seq,
			entry.id,
			hash,
			entry.n,
			entry.device,
			entry.author,
			entry.kind,
			entry.v,
			entry.seam ?? null,
			entry.assembly ?? null,
			text,
			this.#place.link,
			line.seal
		]);
		this.#leaveAside(entry.id, hash);
	}

	/** A line that entered the log no longer waits. Other bytes under its id never can. */
	#leaveAside(id: string, hash: string): void {
		this.#held.delete(id, hash);
		this.#quarantine.delete(id, hash);
		for (const other of [...this.#held.under(id), ...this.#quarantine.under(id)])
			this.quarantine({ ...other, code: 'entry.id_conflict', stands_on: null });
	}

	/** The tables that repeat what the log says: changed with the line that says it, or not at all. */
	#derive(entry: Entry): void {
		switch (entry.kind) {
			case 'build.opened':
				this.#name = entry.body.name;
				this.#addToCrew(entry);
				return;
			case 'build.described':
				if (entry.body.name !== undefined) this.#name = entry.body.name;
				return;
			case 'crew.joined':
			case 'crew.role':
			case 'crew.left':
			case 'owner.changed':
				this.#addToCrew(entry);
				return;
			case 'device.enrolled':
				if (this.#devices.has(entry.device)) return;
				this.#devices.set(entry.device, { person: entry.author, key: entry.body.key });
				this.#changed.devices.add(entry.device);
				return;
			case 'entry.withdrawn':
				if (this.#withdrawn.has(entry.body.entry)) return;
				this.#withdrawn.set(entry.body.entry, entry.id);
				this.#changed.withdrawn.add(entry.body.entry);
				this.#changed.bodies.add(entry.body.entry);
		}
	}

	#addToCrew(entry: Entry): void {
		if (!this.#crew) throw new Error('the crew was not loaded');
		this.#crew.push(foldLine(entry));
		this.#crewMoved = true;
	}

	/** Keeps a line outside the history until `waitsFor` has arrived. */
	hold(line: SealedLine, carrier: string, waitsFor: string): void {
		const { text, hash, seal } = line;
		const { id } = line.entry;
		const received = this.#held.get(id, hash)?.received ?? this.received;
		this.#held.set({ id, hash, text, seal, carrier, waits_for: waitsFor, received });
		this.#quarantine.delete(id, hash);
	}

	/** Keeps a refused line for the owner, beside other bytes under its id. */
	quarantine(
		line: Pick<QuarantinedLine, 'id' | 'hash' | 'text' | 'seal' | 'carrier'> & {
			code: RefusalCode;
			stands_on?: string | null;
			received?: number;
		}
	): void {
		const { id, hash, text, seal, carrier, code, stands_on = null } = line;
		const same = this.#quarantine.get(id, hash);
		this.#lookedUp.add(id);
		this.#quarantine.set({
			id,
			hash,
			text,
			seal,
			carrier,
			code,
			stands_on,
			received: same?.received ?? line.received ?? this.received,
			decision: same?.decision ?? null,
			decided_by: same?.decided_by ?? null,
			decided_at: same?.decided_at ?? null
		});
		this.#held.delete(id, hash);
	}

	discard(id: string, hash: string, person: string): void {
		const line = this.#quarantine.get(id, hash);
		if (!line) return;
		this.#quarantine.set({
			...line,
			decision: 'discarded',
			decided_by: person,
			decided_at: this.received
		});
	}

	/** How many lines this carrier has in quarantine, with those of this transaction. */
	async quarantinedBy(carrier: string): Promise<number> {
		const { count } = await this.#trx
			.selectFrom('quarantine')
			.select((select) => select.fn.countAll<number>().as('count'))
			.where('build', '=', this.build)
			.where('carrier', '=', carrier)
			.executeTakeFirstOrThrow();
		return count;
	}

	// ---- writing ---------------------------------------------------------------------------------------------

	/** Writes everything. Must be the last thing done with this journal. */
	async flush(): Promise<void> {
		const { build } = this;
		const trx = this.#trx;
		const changed = this.#changed;
		if (this.#appended.length > 0) {
			await sql`
				insert into entry (build, received, seq, id, hash, n, device, author, kind, v, seam, assembly, text, link, seal)
				select ${build}, ${this.received}, value ->> 0, value ->> 1, value ->> 2, value ->> 3, value ->> 4,
					value ->> 5, value ->> 6, value ->> 7, value ->> 8, value ->> 9, value ->> 10, value ->> 11, value ->> 12
				from jsonb_each(${JSON.stringify(this.#appended)})
			`.execute(trx);
			await trx
				.updateTable('build')
				.set({
					seq: this.#place.seq,
					link: this.#place.link,
					max_n: this.#maxN,
					name: this.#name
				})
				.where('id', '=', build)
				.execute();
		}
		if (this.#seals.size > 0) {
			const rows = [...this.#seals].map(([name, seal]) => [
				name,
				seal.device,
				JSON.stringify(seal.hashes),
				seal.signature
			]);
			await sql`
				insert or ignore into seal (build, name, device, hashes, signature)
				select ${build}, value ->> 0, value ->> 1, value ->> 2, value ->> 3
				from jsonb_each(${JSON.stringify(rows)})
			`.execute(trx);
		}
		const members = this.#membersNow();
		for (const person of changed.members) {
			const { role, left } = members.get(person) as Member;
			const values = { role, left: left ? (1 as const) : (0 as const) };
			await trx
				.insertInto('member')
				.values({ build, person, ...values })
				.onConflict((conflict) => conflict.columns(['build', 'person']).doUpdateSet(values))
				.execute();
		}
		for (const device of changed.devices) {
			const row = this.#devices.get(device) as Device;
			await trx
				.insertInto('device')
				.values({ build, device, ...row })
				.execute();
		}
		await this.#flushAside('held', this.#held);
		await this.#flushAside('quarantine', this.#quarantine);
		for (const id of changed.withdrawn)
			await trx
				.insertInto('withdrawn')
				.values({ build, id, by: this.#withdrawn.get(id) as string })
				.execute();
		if (changed.bodies.size > 0) await this.#takeBodies(changed.bodies);
	}

	async #flushAside(
		table: 'held' | 'quarantine',
		aside: Aside<HeldLine> | Aside<QuarantinedLine>
	): Promise<void> {
		const { changed } = aside;
		if (changed.length === 0) return;
		const { build } = this;
		await sql`
			delete from ${sql.table(table)} where build = ${build}
				and (id, hash) in (select value ->> 0, value ->> 1 from jsonb_each(${JSON.stringify(changed)}))
		`.execute(this.#trx);
		const lines = changed.flatMap(([id, hash]) => aside.get(id, hash) ?? []);
		if (lines.length === 0) return;
		const json = JSON.stringify(lines);
		const common = sql`${build}, value ->> 'id', value ->> 'hash', value ->> 'text', value ->> 'seal',
			value ->> 'carrier', value ->> 'received'`;
		await (
			table === 'held'
				? sql`
					insert into held (build, id, hash, text, seal, carrier, received, waits_for)
					select ${common}, value ->> 'waits_for' from jsonb_each(${json})`
				: sql`
					insert into quarantine (build, id, hash, text, seal, carrier, received, code, stands_on, decision,
						decided_by, decided_at)
					select ${common}, value ->> 'code', value ->> 'stands_on', value ->> 'decision',
						value ->> 'decided_by', value ->> 'decided_at' from jsonb_each(${json})`
		).execute(this.#trx);
	}

	/** Takes the body out of lines of the log. Envelope, hash and seal stay: verification reports what is missing. */
	async #takeBodies(ids: ReadonlySet<string>): Promise<void> {
		const rows = await this.#trx
			.selectFrom('entry')
			.select(['seq', 'text'])
			.where('build', '=', this.build)
			.where('id', 'in', listed(ids))
			.execute();
		for (const { seq, text } of rows)
			await this.#trx
				.updateTable('entry')
				.set({ text: envelopeOf(text) })
				.where('build', '=', this.build)
				.where('seq', '=', seq)
				.execute();
	}
}

function foldLine(entry: Entry): FoldLine {
	return { id: entry.id, envelope: entry, entry };
}

/** The canonical text of an entry without its body. */
function envelopeOf(text: string): string {
	const envelope = JSON.parse(text) as Record<string, Json>;
	delete envelope['body'];
	return canonicalText(envelope);
}
