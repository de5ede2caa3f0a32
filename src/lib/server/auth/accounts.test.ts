import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import type { Db } from '../db';
import {
	changePassword,
	findPersonByEmail,
	personNames,
	register,
	signIn,
	signOut
} from './accounts';
import { verifyPassword } from './hashing';
import { findSession } from './sessions';
import { temporaryDb } from './testing';

// Watched, not replaced: whether a password was hashed at all is what an answer's time would tell.
vi.mock('./hashing', { spy: true });

const PASSWORD = 'longeron flap gusset';
const NEW = 'doubler rib nose skin';

let db: Db;
let close: () => Promise<void>;

beforeEach(async () => {
	vi.useFakeTimers({ toFake: ['Date'], now: Date.UTC(2026, 11, 1) });
	({ db, close } = await temporaryDb());
});
afterEach(async () => {
	vi.useRealTimers();
	await close();
});

const erna = { email: 'Erna@Example.org', name: 'Erna', password: PASSWORD, address: '192.0.2.1' };

/** Registers and returns what came of it; fails the test when it was refused. */
async function registered(input: Parameters<typeof register>[1] = erna) {
	const result = await register(db, input);
	if (!result.ok) throw new Error(result.code);
	return result;
}

function signInAs(email: string, password: string, address = '192.0.2.1', oldToken?: string) {
	return signIn(db, { email, password, address, ...(oldToken !== undefined && { oldToken }) });
}

describe('registering', () => {
	it('makes an account under the address as typed and signs it in', async () => {
		const { person, session } = await registered({
			...erna,
			email: ' Erna@Example.org ',
			name: ' Erna '
		});
		expect(person).toMatchObject({ name: 'Erna', email: 'Erna@Example.org' });
		expect(person.id).toMatch(
			/^[0-9a-f]{8}-[0-9a-f]{4}-7[0-9a-f]{3}-[89ab][0-9a-f]{3}-[0-9a-f]{12}$/
		);
		expect((await findSession(db, session.token))?.person).toEqual(person);
	});

	it('refuses a second account for one address in any spelling, and leaves the first alone', async () => {
		const first = await registered();
		expect(await register(db, { ...erna, email: 'ERNA@example.ORG', name: 'Other' })).toMatchObject(
			{
				ok: false,
				code: 'account.email_taken',
				field: 'email'
			}
		);
		expect(await findPersonByEmail(db, erna.email)).toEqual({ id: first.person.id, name: 'Erna' });
	});

	it('lets one through when two register the same address at once', async () => {
		const results = await Promise.all([register(db, erna), register(db, erna)]);
		expect(results.filter((result) => result.ok)).toHaveLength(1);
		expect(await db.selectFrom('person').select('name').execute()).toHaveLength(1);
	});

	it.each([
		[{ email: 'erna' }, 'account.email', 'email'],
		[{ name: '   ' }, 'account.name', 'name'],
		[{ name: 'x'.repeat(81) }, 'account.name', 'name'],
		[{ name: 'a\u0000b' }, 'account.name', 'name'],
		[{ password: 'short' }, 'account.password_short', 'password'],
		[{ password: 'x'.repeat(201) }, 'account.password_long', 'password'],
		[{ password: 'password123456789' }, 'account.password_common', 'password'],
		[{ password: 'erna erna erna 1' }, 'account.password_common', 'password']
	])('refuses %j and names the field', async (wrong, code, field) => {
		expect(await register(db, { ...erna, ...wrong })).toEqual({ ok: false, code, field });
		expect(await db.selectFrom('person').selectAll().execute()).toEqual([]);
	});

	it('is limited per address', async () => {
		const tries = [];
		for (let i = 0; i < 31; i++) tries.push(await register(db, { ...erna, password: 'short' }));
		expect(tries.at(-2)).toMatchObject({ code: 'account.password_short' });
		expect(tries.at(-1)).toMatchObject({ code: 'account.throttled', retryAfter: 3600 });
		expect(await register(db, { ...erna, address: '192.0.2.2' })).toMatchObject({ ok: true });
	});
});

describe('signing in', () => {
	it('takes the address in any spelling and the password exactly', async () => {
		const { person } = await registered();
		expect(await signInAs(' erna@EXAMPLE.org', PASSWORD)).toMatchObject({ ok: true, person });
		for (const wrong of [PASSWORD.toUpperCase(), `${PASSWORD} `, PASSWORD.slice(0, -1), '']) {
			expect(await signInAs(erna.email, wrong)).toEqual({ ok: false, code: 'account.sign_in' });
		}
	});

	it('answers the same for a wrong password, for nobody, and for what is no address', async () => {
		await registered();
		const hashing = vi.mocked(verifyPassword);
		hashing.mockClear();
		const wrong = await signInAs(erna.email, 'wrong password');
		expect(hashing).toHaveBeenCalledTimes(1);
		expect(await signInAs('nobody@example.org', 'wrong password')).toEqual(wrong);
		expect(hashing).toHaveBeenCalledTimes(2);
		expect(await signInAs('x'.repeat(100_000), 'x'.repeat(100_000))).toEqual(wrong);
	});

	it('gives a new token each time and ends the one this browser had', async () => {
		const first = await registered();
		const second = await signInAs(erna.email, PASSWORD, '192.0.2.1', first.session.token);
		if (!second.ok) throw new Error(second.code);
		expect(second.session.token).not.toBe(first.session.token);
		expect(await findSession(db, first.session.token)).toBeUndefined();
		const planted = 'A'.repeat(43);
		const third = await signInAs(erna.email, PASSWORD, '192.0.2.1', planted);
		expect(third.ok && third.session.token).not.toBe(planted);
		expect(await findSession(db, planted)).toBeUndefined();
		expect(await findSession(db, second.session.token)).toBeDefined();
	});

	it('is limited per account, known or not, also when fifty come at once', async () => {
		const { session } = await registered();
		for (const email of [erna.email, 'nobody@example.org']) {
			const address = email;
			const results = await Promise.all(
				Array.from({ length: 50 }, () => signInAs(email, 'wrong password', address))
			);
			const codes = results.map((result) => (result.ok ? 'in' : result.code));
			expect(codes.filter((code) => code === 'account.sign_in')).toHaveLength(10);
			expect(codes.filter((code) => code === 'account.throttled')).toHaveLength(40);
		}
		// Nobody can sign a person out, or keep one out for longer than the wait.
		expect(await signInAs(erna.email, PASSWORD, '198.51.100.1')).toEqual({
			ok: false,
			code: 'account.throttled',
			retryAfter: 900
		});
		expect(await findSession(db, session.token)).toBeDefined();
		vi.setSystemTime(Date.now() + 900_000);
		expect(await signInAs(erna.email, PASSWORD)).toMatchObject({ ok: true });
	}, 30_000);

	it('does not count against a person who knows the password', async () => {
		await registered();
		for (let i = 0; i < 12; i++) {
			expect(await signInAs(erna.email, PASSWORD)).toMatchObject({ ok: true });
		}
	}, 30_000);

	it('of somebody who signed out ends that session only', async () => {
		const { session } = await registered();
		const other = await signInAs(erna.email, PASSWORD);
		if (!other.ok) throw new Error(other.code);
		await signOut(db, { token: session.token });
		expect(await findSession(db, session.token)).toBeUndefined();
		expect(await findSession(db, other.session.token)).toBeDefined();
	});
});

describe('changing the password', () => {
	it('needs the present one, ends every session and opens a new one here', async () => {
		const { person, session } = await registered();
		const other = await signInAs(erna.email, PASSWORD);
		if (!other.ok) throw new Error(other.code);
		const change = { person: person.id, current: PASSWORD, password: NEW };

		expect(await changePassword(db, { ...change, current: 'wrong password' })).toEqual({
			ok: false,
			code: 'account.password_wrong',
			field: 'current'
		});
		expect(await findSession(db, other.session.token)).toBeDefined();

		const changed = await changePassword(db, change);
		if (!changed.ok) throw new Error(changed.code);
		expect(await findSession(db, session.token)).toBeUndefined();
		expect(await findSession(db, other.session.token)).toBeUndefined();
		expect((await findSession(db, changed.session.token))?.person).toEqual(person);
		expect(await signInAs(erna.email, PASSWORD)).toMatchObject({ code: 'account.sign_in' });
		expect(await signInAs(erna.email, NEW)).toMatchObject({ ok: true });
	});

	it('holds the new one to the same rules', async () => {
		const { person } = await registered();
		const change = { person: person.id, current: PASSWORD };
		for (const [password, code] of [
			['short', 'account.password_short'],
			['tallybar tallybar', 'account.password_common']
		] as const) {
			expect(await changePassword(db, { ...change, password })).toEqual({
				ok: false,
				code,
				field: 'password'
			});
		}
		expect(await signInAs(erna.email, PASSWORD)).toMatchObject({ ok: true });
	});

	it('lets one of two changes at once through', async () => {
		const { person } = await registered();
		const results = await Promise.all(
			[NEW, 'a quite different phrase'].map((password) =>
				changePassword(db, { person: person.id, current: PASSWORD, password })
			)
		);
		expect(results.filter((result) => result.ok)).toHaveLength(1);
		expect(await db.selectFrom('session').selectAll().execute()).toHaveLength(1);
	});

	it('leaves no session behind for a sign-in with the old one that was under way', async () => {
		const { person } = await registered();
		const [entering, changed] = await Promise.all([
			signInAs(erna.email, PASSWORD),
			changePassword(db, { person: person.id, current: PASSWORD, password: NEW })
		]);
		expect(changed.ok).toBe(true);
		const left = await db.selectFrom('session').select('id').execute();
		expect(left).toEqual([{ id: changed.ok && changed.session.id }]);
		expect(entering.ok && (await findSession(db, entering.session.token))).toBeFalsy();
	});

	it('is limited per person, without locking the account for those who sign in', async () => {
		const { person } = await registered();
		const guess = { person: person.id, current: 'wrong password', password: NEW };
		const results = await Promise.all(Array.from({ length: 20 }, () => changePassword(db, guess)));
		const throttled = results.filter((result) => !result.ok && result.code === 'account.throttled');
		expect(throttled).toHaveLength(10);
		expect(await signInAs(erna.email, PASSWORD)).toMatchObject({ ok: true });
	}, 30_000);
});

describe('looking people up', () => {
	it('finds by address in any spelling, and names by id', async () => {
		const { person } = await registered();
		expect(await findPersonByEmail(db, ' ERNA@example.org')).toEqual({
			id: person.id,
			name: 'Erna'
		});
		expect(await findPersonByEmail(db, 'nobody@example.org')).toBeUndefined();
		expect(await personNames(db, [person.id, 'unknown'])).toEqual(new Map([[person.id, 'Erna']]));
		expect(await personNames(db, [])).toEqual(new Map());
	});
});
