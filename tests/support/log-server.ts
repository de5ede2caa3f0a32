/** The server's log on a real database file in a folder of its own, without HTTP. */
import { copyFileSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { sql } from 'kysely';
import { next, start } from '../../src/lib/logbook/chain';
import { hashText } from '../../src/lib/logbook/bytes';
import type { Role } from '../../src/lib/logbook/kinds';
import type { Proof, PushAnswer, PushResult } from '../../src/lib/logbook/wire';
import { openDb } from '../../src/lib/server/db';
import { addMember, changeRole } from '../../src/lib/server/log/crew';
import { Live } from '../../src/lib/server/log/live';
import type { LogServer } from '../../src/lib/server/log/log-server';
import { pull } from '../../src/lib/server/log/pull';
import { push } from '../../src/lib/server/log/push';
import { openServerKey } from '../../src/lib/server/log/server-key';
import { migrate } from '../../src/lib/server/migrate';
import { enrol, makeDevice, openBuild, sealedPush } from './people';
import type { TestDevice, TestLine } from './people';

export class TestLogServer implements LogServer {
	readonly folder: string;
	db: LogServer['db'];
	readonly key: LogServer['key'];
	live: Live;

	private constructor(folder: string) {
		this.folder = folder;
		this.db = openDb(this.#file);
		this.key = openServerKey(folder);
		this.live = new Live(this.db);
	}

	static async make(): Promise<TestLogServer> {
		const server = new TestLogServer(mkdtempSync(join(tmpdir(), 'tallybar-log-')));
		await migrate(server.db, server.folder);
		return server;
	}

	get #file(): string {
		return join(this.folder, 'tallybar.db');
	}

	/** Copies the database file away, as a backup does. */
	async backUp(): Promise<void> {
		await sql`pragma wal_checkpoint(truncate)`.execute(this.db);
		copyFileSync(this.#file, `${this.#file}.backup`);
	}

	/** Puts the last copy back, as after a lost disk; without one, begins with an empty database. */
	async restore({ empty = false } = {}): Promise<void> {
		this.live.close();
		await this.db.destroy();
		for (const tail of ['-wal', '-shm']) rmSync(this.#file + tail, { force: true });
		if (empty) rmSync(this.#file);
		else copyFileSync(`${this.#file}.backup`, this.#file);
		this.db = openDb(this.#file);
		this.live = new Live(this.db);
		await migrate(this.db, this.folder);
	}

	async close(): Promise<void> {
		this.live.close();
		await this.db.destroy();
		rmSync(this.folder, { recursive: true });
	}

	/** An account, and a device of this person. */
	async makePerson(name: string): Promise<TestDevice & { email: string }> {
		const device = await makeDevice();
		const email = `${name.toLowerCase()}.${device.author}@example.org`;
		await this.addAccount(device.author, name, email);
		return { ...device, email };
	}

	async addAccount(id: string, name: string, email: string): Promise<void> {
		await this.db
			.insertInto('person')
			.values({ id, email, email_key: email, name, password_hash: '-', created: 0 })
			.execute();
	}

	/** Pushes lines of a device in its person's own session. @throws on a refusal of the whole request */
	async push(
		carrier: TestDevice,
		build: string,
		lines: readonly Pick<TestLine, 'text' | 'hash'>[],
		more: Parameters<typeof sealedPush>[3] = {}
	): Promise<PushAnswer> {
		const request = await sealedPush(carrier, build, lines, more);
		const answer = await push(this, carrier.author, build, request);
		if (typeof answer === 'string') throw new Error(answer);
		return answer;
	}

	/** The same, answering only what became of each line: `accepted`, or the status and its code. */
	async offer(...call: Parameters<TestLogServer['push']>): Promise<string[]> {
		return outcomes((await this.push(...call)).results);
	}

	/** Everything a person can pull, page by page. @throws on a refusal */
	async pullAll(person: string, build: string) {
		const entries: { seq: number; received: number; text: string; seal: string }[] = [];
		let place = start(build);
		for (;;) {
			const page = await pull(this, person, build, {
				after: place.seq,
				link: place.link,
				limit: 1000
			});
			if (typeof page === 'string') throw new Error(page);
			for (const line of page.entries)
				entries.push({
					seq: line.seq,
					received: line.received,
					text: line.text ?? line.withdrawn?.envelope ?? '',
					seal: JSON.stringify(page.seals[line.seal ?? -1])
				});
			place = page.next;
			if (page.entries.length === 0) return { entries, next: page.next };
		}
	}

	/** Proof of everything a person can pull now, to be shown after a restore. */
	async proofOf(person: string, build: string): Promise<{ proof: Proof; texts: string[] }> {
		const { entries, next: end } = await this.pullAll(person, build);
		return {
			proof: {
				after: start(build),
				rows: entries.map((line) => [line.received, hashText(line.text)]),
				signature: end.signature
			},
			texts: entries.map((line) => line.text)
		};
	}

	/** Recomputes the whole chain of a build from what is stored. @returns its head; throws where it does not hold */
	async verifyChain(build: string): Promise<{ seq: number; link: string }> {
		const rows = await this.db
			.selectFrom('entry')
			.leftJoin('withdrawn', (join) =>
				join.onRef('withdrawn.build', '=', 'entry.build').onRef('withdrawn.id', '=', 'entry.id')
			)
			.select(['seq', 'received', 'hash', 'text', 'link', 'withdrawn.by'])
			.where('entry.build', '=', build)
			.orderBy('seq')
			.execute();
		let place = start(build);
		for (const row of rows) {
			if (row.by === null && hashText(row.text) !== row.hash)
				throw new Error(`line ${row.seq} is not what was accepted`);
			place = next(place, row);
			if (place.link !== row.link) throw new Error(`the chain breaks at ${row.seq}`);
		}
		const head = await this.db
			.selectFrom('build')
			.select(['seq', 'link'])
			.where('id', '=', build)
			.executeTakeFirstOrThrow();
		if (head.seq !== place.seq || head.link !== place.link) throw new Error('the head is wrong');
		return head;
	}

	/** A build with its owner and a crew, each with an enrolled device. */
	async makeCrew() {
		const owner = await this.makePerson('Olga');
		const { build, opened, enrolled } = openBuild(owner);
		await this.push(owner, build, [opened, enrolled]);
		const join = async (name: string, role: Role) => {
			const person = await this.makePerson(name);
			await this.admit(owner, build, person, role);
			await this.push(person, build, [enrol(person, build)]);
			return person;
		};
		return {
			build,
			owner,
			builder: await join('Bea', 'builder'),
			inspector: await join('Ines', 'inspector'),
			follower: await join('Finn', 'follower')
		};
	}

	async admit(
		owner: TestDevice,
		build: string,
		person: TestDevice & { email: string },
		role: Role
	): Promise<void> {
		const answer = await addMember(this, owner.author, build, person.email, role);
		if (typeof answer === 'string') throw new Error(answer);
	}

	async setRole(owner: TestDevice, build: string, person: TestDevice, role: Role): Promise<void> {
		const answer = await changeRole(this, owner.author, build, person.author, role);
		if (typeof answer === 'string') throw new Error(answer);
	}
}

export function outcomes(results: readonly PushResult[]): string[] {
	return results.map(({ status, code }) => (code === undefined ? status : `${status} ${code}`));
}
