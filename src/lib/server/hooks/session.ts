import type { Handle } from '@sveltejs/kit';
import { readSessionCookie, setSessionCookie } from '../auth/cookie';
import { findSession } from '../auth/sessions';
import { getDb } from '../db';

/** Finds out who is signed in, and renews the cookie of a session that was renewed. */
export const session: Handle = async ({ event, resolve }) => {
	const token = readSessionCookie(event.cookies);
	// Files and addresses that are no route need no person; most of all they need no database.
	if (token === undefined || event.route.id === null) return resolve(event);
	const found = await findSession(getDb(), token);
	// The cookie of a session that is over stays. Taken away here, it would take the new one with it
	// that the answer to a password change, overtaken by this one, has just set.
	if (found !== undefined) {
		event.locals.person = found.person;
		event.locals.session = found.session;
		if (found.renewed) {
			setSessionCookie(event.cookies, { token, expires: found.session.expires });
		}
	}
	return resolve(event);
};
