import type { Cookies } from '@sveltejs/kit';
import { config } from '../config';
import type { NewSession } from './sessions';

/**
 * Over https the browser takes a `__Host-` cookie only from this very host, with Secure and without a
 * domain, so that no other host of the domain can plant one. Plain http (localhost, a trial in the
 * shop) has no such protection.
 */
function cookie() {
	const secure = config().origin.startsWith('https:');
	return {
		name: secure ? '__Host-tallybar' : 'tallybar',
		options: { path: '/', httpOnly: true, sameSite: 'lax', secure } as const
	};
}

/** The token this browser sent, if any. */
export function readSessionCookie(cookies: Cookies): string | undefined {
	return cookies.get(cookie().name);
}

/** Keeps the token in the browser for as long as the session lasts if nobody comes back. */
export function setSessionCookie(
	cookies: Cookies,
	session: Pick<NewSession, 'token' | 'expires'>
): void {
	const { name, options } = cookie();
	cookies.set(name, session.token, { ...options, expires: new Date(session.expires) });
}

/** Takes the token out of the browser. */
export function deleteSessionCookie(cookies: Cookies): void {
	const { name, options } = cookie();
	cookies.delete(name, options);
}
