import { createHash, randomBytes } from 'node:crypto';
import { Lucia, TimeSpan } from 'lucia';
import type { Adapter } from 'lucia';
import type { Db } from '../db';
import { log } from '../logger';
import { write } from '../write';

const DAY = 86_400_000;
/** A session that nobody used for so long is over. */
const IDLE = 30 * DAY;
/** However much it is used: then the password is asked for again. */
const ABSOLUTE = 180 * DAY;
/** Renewed when it was last renewed so long ago: not a write for every request. */
const RENEW_AFTER = DAY;

/** The signed-in person, as pages and functions see them. */
export interface SignedIn {
	id: string;
	name: string;
	email: string;
}

/** A session without its token: safe to hand around and to log. */
export interface Session {
	/** SHA-256 of the token. */
	id: string;
	/** Milliseconds since 1970. */
	created: number;
	/** Milliseconds since 1970; never later than `created` + 180 days. */
	expires: number;
}

export interface NewSession extends Session {
	/** What the cookie carries. It stands nowhere else: not in the database, a log or an answer's body. */
	token: string;
}

interface SessionAttributes {
	created: number;
}
interface UserAttributes {
	email: string;
	name: string;
}

declare module 'lucia' {
	interface Register {
		Lucia: Lucia<SessionAttributes, UserAttributes>;
		DatabaseSessionAttributes: SessionAttributes;
		DatabaseUserAttributes: UserAttributes;
	}
}

/**
 * Lucia's store over our tables. Given a transaction it writes inside that; given the database it
 * goes through the write queue, as every write must.
 */
export function sessionAdapter(db: Db): Adapter {
	const run = <T>(work: (at: Db) => Promise<T>): Promise<T> =>
		db.isTransaction ? work(db) : write(db, work);
	const sessions = db
		.selectFrom('session')
		.innerJoin('person', 'person.id', 'session.person_id')
		.select(['session.id', 'person_id', 'session.created', 'expires', 'email', 'name']);
	const session = (row: { id: string; person_id: string; created: number; expires: number }) => ({
		id: row.id,
		userId: row.person_id,
		expiresAt: new Date(row.expires),
		attributes: { created: row.created }
	});

	return {
		getSessionAndUser: async (id) => {
			const row = await sessions.where('session.id', '=', id).executeTakeFirst();
			if (row === undefined) return [null, null];
			const { email, name } = row;
			return [session(row), { id: row.person_id, attributes: { email, name } }];
		},
		getUserSessions: async (person) => {
			const rows = await sessions.where('person_id', '=', person).execute();
			return rows.map(session);
		},
		setSession: async ({ id, userId, expiresAt, attributes: { created } }) => {
			const expires = Math.min(expiresAt.getTime(), created + ABSOLUTE);
			await run((at) =>
				at.insertInto('session').values({ id, person_id: userId, created, expires }).execute()
			);
		},
		updateSessionExpiration: async (id, expiresAt) => {
			try {
				await run((at) =>
					at
						.updateTable('session')
						.set((row) => ({
							// The absolute limit holds whatever asks for more.
							expires: row.fn<number>('min', [
								row.val(expiresAt.getTime()),
								row('created', '+', ABSOLUTE)
							])
						}))
						.where('id', '=', id)
						.execute()
				);
			} catch (error) {
				// On a full disk people go on reading their log; the next request renews.
				log().warn({ err: error }, 'session not renewed');
			}
		},
		deleteSession: async (id) => {
			await run((at) => at.deleteFrom('session').where('id', '=', id).execute());
		},
		deleteUserSessions: async (person) => {
			await run((at) => at.deleteFrom('session').where('person_id', '=', person).execute());
		},
		deleteExpiredSessions: async () => {
			await run((at) => at.deleteFrom('session').where('expires', '<=', Date.now()).execute());
		}
	};
}

function luciaOver(db: Db): Lucia<SessionAttributes, UserAttributes> {
	return new Lucia<SessionAttributes, UserAttributes>(sessionAdapter(db), {
		sessionExpiresIn: new TimeSpan(IDLE, 'ms'),
		getSessionAttributes: ({ created }) => ({ created }),
		getUserAttributes: ({ email, name }) => ({ email, name })
	});
}

/** What is kept of a token. The token has 256 random bits, so one plain hash is enough. */
export function tokenHash(token: string): string {
	return createHash('sha256').update(token).digest('base64url');
}

/** Opens a session for a person who has just proved who they are, under a token never used before. */
export async function openSession(db: Db, person: string): Promise<NewSession> {
	const token = randomBytes(32).toString('base64url');
	const lucia = luciaOver(db);
	const { id, created, expiresAt } = await lucia.createSession(
		person,
		{ created: Date.now() },
		{ sessionId: tokenHash(token) }
	);
	return { token, id, created, expires: expiresAt.getTime() };
}

/**
 * Who a token belongs to, or undefined when its session is over or never was. A session in use is
 * renewed about once a day; then `renewed` is true and the cookie must be set again.
 */
export async function findSession(
	db: Db,
	token: string
): Promise<{ person: SignedIn; session: Session; renewed: boolean } | undefined> {
	if (!/^[A-Za-z0-9_-]{43}$/.test(token)) return undefined;
	const { session, user } = await luciaOver(db).validateSession(tokenHash(token));
	if (session === null) return undefined;
	const last = session.created + ABSOLUTE;
	let expires = Math.min(session.expiresAt.getTime(), last);
	let renewed = session.fresh;
	// Lucia renews only in the second half of the 30 days: who works every other week would be
	// signed out after 16 days without the app.
	const wanted = Math.min(Date.now() + IDLE, last);
	if (wanted - expires >= RENEW_AFTER) {
		await sessionAdapter(db).updateSessionExpiration(session.id, new Date(wanted));
		expires = wanted;
		renewed = true;
	}
	return {
		person: { id: user.id, name: user.name, email: user.email },
		session: { id: session.id, created: session.created, expires },
		renewed
	};
}

/** Ends the session of a token; one that is already over is no error. */
export async function endSession(db: Db, token: string): Promise<void> {
	await luciaOver(db).invalidateSession(tokenHash(token));
}

/** Ends all sessions of a person. */
export async function endSessionsOf(db: Db, person: string): Promise<void> {
	await luciaOver(db).invalidateUserSessions(person);
}

/** Removes the rows of sessions that are over anyway. */
export async function removeExpiredSessions(db: Db): Promise<void> {
	await luciaOver(db).deleteExpiredSessions();
}

/** Whether a session still holds: what a stream that stays open must ask again now and then. */
export async function sessionHolds(db: Db, id: string): Promise<boolean> {
	const row = await db
		.selectFrom('session')
		.select('id')
		.where('id', '=', id)
		.where('expires', '>', Date.now())
		.executeTakeFirst();
	return row !== undefined;
}
