import { z } from 'zod';
import { idMaker } from '../../logbook/id';
import type { RefusalCode } from '../../logbook/refusals';
import { text } from '../../logbook/scalars';
import type { Db, Trx } from '../db';
import { write } from '../write';
import { Email, emailKey } from './email';
import { HashingBusyError, hashPassword, NOBODYS_HASH, verifyPassword } from './hashing';
import { passwordProblem } from './password-rules';
import {
	endSession,
	endSessionsOf,
	openSession,
	removeExpiredSessions,
	type NewSession,
	type SignedIn
} from './sessions';
import { countTry, giveBack, type Subject } from './throttle';

export interface Refused {
	ok: false;
	code: RefusalCode;
	/** The field to write the reason beside; none when it concerns the whole form. */
	field?: 'email' | 'name' | 'password' | 'current';
	/** Whole seconds until it is worth trying again. */
	retryAfter?: number;
}
export type Outcome<T> = ({ ok: true } & T) | Refused;

const newId = idMaker(Date.now, (bytes) => crypto.getRandomValues(bytes));

const Name = z
	.string()
	.max(1000)
	.transform((given) => given.normalize('NFC').trim())
	.pipe(text(80));

const refused = (code: RefusalCode, more: Partial<Refused> = {}): Refused => ({
	ok: false,
	code,
	...more
});

/** A queue of passwords that is full is nobody's fault and soon over. */
async function unlessBusy<T>(work: () => Promise<Outcome<T>>): Promise<Outcome<T>> {
	try {
		return await work();
	} catch (error) {
		if (error instanceof HashingBusyError) return refused('request.unavailable', { retryAfter: 5 });
		throw error;
	}
}

/**
 * Makes an account and signs it in. `address` is the caller's, for the limit; `oldToken` the one of a
 * session that was open in this browser, which is ended.
 */
export async function register(
	db: Db,
	input: { email: string; name: string; password: string; address: string; oldToken?: string }
): Promise<Outcome<{ person: SignedIn; session: NewSession }>> {
	const email = Email.safeParse(input.email);
	if (!email.success) return refused('account.email', { field: 'email' });
	const name = Name.safeParse(input.name);
	if (!name.success) return refused('account.name', { field: 'name' });

	const subjects: Subject[] = [{ limit: 'register', whom: input.address }];
	const count = await countTry(db, subjects);
	if (!count.allowed) return refused('account.throttled', { retryAfter: count.retryAfter });

	const key = emailKey(email.data);
	const problem = passwordProblem(input.password, key);
	if (problem !== undefined) return refused(problem, { field: 'password' });

	return unlessBusy(async () => {
		const hash = await hashPassword(input.password);
		const now = Date.now();
		const person: SignedIn = { id: newId(), name: name.data, email: email.data };
		const session = await write(db, async (trx) => {
			const added = await trx
				.insertInto('person')
				.values({ ...person, email_key: key, password_hash: hash, created: now })
				.onConflict((conflict) => conflict.column('email_key').doNothing())
				.returning('id')
				.executeTakeFirst();
			return added === undefined ? undefined : replaceSession(trx, person.id, input.oldToken);
		});
		if (session === undefined) return refused('account.email_taken', { field: 'email' });
		return { ok: true, person, session };
	});
}

/**
 * Signs in. A wrong password and an address without account get the same answer after the same work.
 * The session gets a token never used before, and the one of `oldToken` ends: a token that somebody
 * planted in this browser is worth nothing afterwards.
 */
export async function signIn(
	db: Db,
	input: { email: string; password: string; address: string; oldToken?: string }
): Promise<Outcome<{ person: SignedIn; session: NewSession }>> {
	const key = emailKey(input.email);
	const subjects: Subject[] = [
		{ limit: 'account', whom: key },
		{ limit: 'address', whom: input.address }
	];
	const count = await countTry(db, subjects);
	if (!count.allowed) return refused('account.throttled', { retryAfter: count.retryAfter });

	return unlessBusy(async () => {
		const found = await db
			.selectFrom('person')
			.select(['id', 'name', 'email', 'password_hash'])
			.where('email_key', '=', key)
			.executeTakeFirst();
		const hash = found?.password_hash ?? NOBODYS_HASH;
		if (!(await verifyPassword(hash, input.password)) || found === undefined) {
			return refused('account.sign_in');
		}
		const session = await write(db, async (trx) => {
			await giveBack(trx, subjects);
			await removeExpiredSessions(trx);
			// Changed while this one was being checked: what ended the other sessions ends this one too.
			if (!(await stillHas(trx, found.id, hash))) return undefined;
			return replaceSession(trx, found.id, input.oldToken);
		});
		if (session === undefined) return refused('account.sign_in');
		return { ok: true, person: { id: found.id, name: found.name, email: found.email }, session };
	});
}

/** Ends the session of this token. Succeeds also when it was over already. */
export async function signOut(db: Db, input: { token: string }): Promise<void> {
	await endSession(db, input.token);
}

/**
 * Changes the password of a signed-in person who also knows the present one. All sessions end; this
 * browser gets a new one.
 */
export async function changePassword(
	db: Db,
	input: { person: string; current: string; password: string }
): Promise<Outcome<{ session: NewSession }>> {
	const subjects: Subject[] = [{ limit: 'change', whom: input.person }];
	const count = await countTry(db, subjects);
	if (!count.allowed) return refused('account.throttled', { retryAfter: count.retryAfter });

	return unlessBusy(async () => {
		const found = await db
			.selectFrom('person')
			.select(['email_key', 'password_hash'])
			.where('id', '=', input.person)
			.executeTakeFirst();
		if (found === undefined) return refused('session.none');
		if (!(await verifyPassword(found.password_hash, input.current))) {
			return refused('account.password_wrong', { field: 'current' });
		}
		const problem = passwordProblem(input.password, found.email_key);
		if (problem !== undefined) {
			await write(db, (trx) => giveBack(trx, subjects));
			return refused(problem, { field: 'password' });
		}
		const hash = await hashPassword(input.password);
		const session = await write(db, async (trx) => {
			await giveBack(trx, subjects);
			// Of two changes at once one must fail, or somebody is left with a password not told to them.
			if (!(await stillHas(trx, input.person, found.password_hash))) return undefined;
			await trx
				.updateTable('person')
				.set({ password_hash: hash })
				.where('id', '=', input.person)
				.execute();
			await endSessionsOf(trx, input.person);
			return openSession(trx, input.person);
		});
		if (session === undefined) return refused('account.password_wrong', { field: 'current' });
		return { ok: true, session };
	});
}

/** The account with this e-mail address, however it is spelled, or undefined. */
export async function findPersonByEmail(
	db: Db,
	email: string
): Promise<{ id: string; name: string } | undefined> {
	return db
		.selectFrom('person')
		.select(['id', 'name'])
		.where('email_key', '=', emailKey(email))
		.executeTakeFirst();
}

/** The names of people by id; ids without an account are left out. */
export async function personNames(db: Db, ids: readonly string[]): Promise<Map<string, string>> {
	const names = new Map<string, string>();
	// SQLite takes some 32,000 parameters in a statement; a crew never comes near.
	for (let from = 0; from < ids.length; from += 1000) {
		const rows = await db
			.selectFrom('person')
			.select(['id', 'name'])
			.where('id', 'in', ids.slice(from, from + 1000))
			.execute();
		for (const { id, name } of rows) names.set(id, name);
	}
	return names;
}

async function replaceSession(
	trx: Trx,
	person: string,
	oldToken: string | undefined
): Promise<NewSession> {
	if (oldToken !== undefined) await endSession(trx, oldToken);
	return openSession(trx, person);
}

async function stillHas(trx: Trx, person: string, passwordHash: string): Promise<boolean> {
	const row = await trx
		.selectFrom('person')
		.select('id')
		.where('id', '=', person)
		.where('password_hash', '=', passwordHash)
		.executeTakeFirst();
	return row !== undefined;
}
