import { readdirSync, readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import { sql } from 'kysely';
import type { Db } from '../db';
import { write } from '../write';
import {
	endSession,
	endSessionsOf,
	findSession,
	openSession,
	removeExpiredSessions,
	sessionAdapter,
	sessionHolds,
	tokenHash
} from './sessions';
import { temporaryDb } from './testing';

const DAY = 86_400_000;
const ERNA = '01890000-0000-7000-8000-000000000001';
const OTTO = '01890000-0000-7000-8000-000000000002';

let db: Db;
let file: string;
let close: () => Promise<void>;

const addPerson = (id: string, name: string) =>
	write(db, (trx) =>
		trx
			.insertInto('person')
			.values({
				id,
				name,
				email: `${name}@example.org`,
				email_key: `${name}@example.org`,
				password_hash: '',
				created: 0
			})
			.execute()
	);

beforeEach(async () => {
	vi.useFakeTimers({ toFake: ['Date'], now: Date.UTC(2026, 11, 1) });
	({ db, file, close } = await temporaryDb());
	await addPerson(ERNA, 'erna');
	await addPerson(OTTO, 'otto');
});
afterEach(async () => {
	vi.useRealTimers();
	await close();
});

const later = (ms: number) => vi.setSystemTime(Date.now() + ms);

describe('a session', () => {
	it('names its person to whoever holds the token, until it is ended', async () => {
		const { token, id } = await openSession(db, ERNA);
		expect(await findSession(db, token)).toMatchObject({
			person: { id: ERNA, name: 'erna', email: 'erna@example.org' },
			session: { id },
			renewed: false
		});
		await endSession(db, token);
		expect(await findSession(db, token)).toBeUndefined();
	});

	it('is found by no other text, and not by what the database holds', async () => {
		const { token, id } = await openSession(db, ERNA);
		for (const other of [
			'',
			id,
			token.slice(1),
			`${token}x`,
			'A'.repeat(43),
			token.toLowerCase()
		]) {
			expect(await findSession(db, other), other).toBeUndefined();
		}
	});

	it('has a token of 256 random bits, never the same twice', async () => {
		const tokens = new Set<string>();
		for (let i = 0; i < 200; i++) tokens.add((await openSession(db, ERNA)).token);
		expect(tokens.size).toBe(200);
		for (const token of tokens) expect(token).toMatch(/^[A-Za-z0-9_-]{43}$/);
		expect(new Set([...tokens].map((token) => token.slice(0, 4))).size).toBeGreaterThan(190);
	});

	it('stands hashed on the disk, in no file with its token', async () => {
		const { token, id } = await openSession(db, ERNA);
		expect(id).toBe(tokenHash(token));
		const folder = dirname(file);
		const disk = readdirSync(folder).map((name) => readFileSync(join(folder, name), 'latin1'));
		expect(disk.join('')).toContain(id);
		expect(disk.join('')).not.toContain(token);
	});

	it('ends after 30 days without use', async () => {
		const { token, id } = await openSession(db, ERNA);
		later(30 * DAY - 1);
		expect(await sessionHolds(db, id)).toBe(true);
		later(1);
		expect(await sessionHolds(db, id)).toBe(false);
		expect(await findSession(db, token)).toBeUndefined();
	});

	it('goes on for 30 days from its last use, renewed once a day at most', async () => {
		const { token } = await openSession(db, ERNA);
		later(DAY - 1);
		expect((await findSession(db, token))?.renewed).toBe(false);
		later(1);
		expect((await findSession(db, token))?.renewed).toBe(true);
		expect((await findSession(db, token))?.renewed).toBe(false);
		later(29 * DAY);
		expect(await findSession(db, token)).toMatchObject({
			renewed: true,
			session: { expires: Date.now() + 30 * DAY }
		});
	});

	it('ends after 180 days however much it is used', async () => {
		const { token, created } = await openSession(db, ERNA);
		for (let week = 1; week <= 25; week++) {
			later(7 * DAY);
			const found = await findSession(db, token);
			expect(found?.session.expires).toBeLessThanOrEqual(created + 180 * DAY);
		}
		later(5 * DAY - 1);
		expect(await findSession(db, token)).toBeDefined();
		later(1);
		expect(await findSession(db, token)).toBeUndefined();
	});

	it('of one person ends without those of others', async () => {
		const [one, two, other] = [
			await openSession(db, ERNA),
			await openSession(db, ERNA),
			await openSession(db, OTTO)
		];
		await endSessionsOf(db, ERNA);
		expect(await findSession(db, one.token)).toBeUndefined();
		expect(await findSession(db, two.token)).toBeUndefined();
		expect((await findSession(db, other.token))?.person.id).toBe(OTTO);
	});

	it('goes with its person', async () => {
		const { token } = await openSession(db, ERNA);
		await write(db, (trx) => trx.deleteFrom('person').where('id', '=', ERNA).execute());
		expect(await findSession(db, token)).toBeUndefined();
	});

	it('still answers while it cannot be renewed on a full disk', async () => {
		const { token } = await openSession(db, ERNA);
		later(2 * DAY);
		await sql`pragma query_only = on`.execute(db);
		expect((await findSession(db, token))?.person.id).toBe(ERNA);
	});
});

describe('the adapter for lucia', () => {
	it('keeps and returns sessions as lucia hands them over', async () => {
		const adapter = sessionAdapter(db);
		const session = {
			id: 'hash',
			userId: ERNA,
			expiresAt: new Date(Date.now() + DAY),
			attributes: { created: Date.now() }
		};
		await adapter.setSession(session);
		expect(await adapter.getUserSessions(ERNA)).toEqual([session]);
		expect(await adapter.getSessionAndUser('hash')).toEqual([
			session,
			{ id: ERNA, attributes: { name: 'erna', email: 'erna@example.org' } }
		]);
		expect(await adapter.getSessionAndUser('other')).toEqual([null, null]);
	});

	it('never lets a session end later than 180 days after its start', async () => {
		const adapter = sessionAdapter(db);
		const created = Date.now();
		const [end, tooLate] = [new Date(created + 180 * DAY), new Date(created + 400 * DAY)];
		await adapter.setSession({
			id: 'a',
			userId: ERNA,
			expiresAt: tooLate,
			attributes: { created }
		});
		expect((await adapter.getUserSessions(ERNA))[0]?.expiresAt).toEqual(end);
		await adapter.updateSessionExpiration('a', tooLate);
		expect((await adapter.getUserSessions(ERNA))[0]?.expiresAt).toEqual(end);
	});

	it('removes what is over, and only that', async () => {
		const old = await openSession(db, ERNA);
		later(29 * DAY);
		const young = await openSession(db, ERNA);
		later(DAY);
		await removeExpiredSessions(db);
		const left = await db.selectFrom('session').select('id').execute();
		expect(left).toEqual([{ id: young.id }]);
		expect(old.id).not.toBe(young.id);
	});

	it('writes inside a transaction it is given, and nothing of one that fails stays', async () => {
		const failing = write(db, async (trx) => {
			await openSession(trx, ERNA);
			throw new Error('afterwards');
		});
		await expect(failing).rejects.toThrow('afterwards');
		expect(await db.selectFrom('session').selectAll().execute()).toEqual([]);
	});
});
