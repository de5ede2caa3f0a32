const BASE = 'http://here.invalid';
const HOME = '/builds';

/**
 * Where to go after signing in: the path asked for when it is a page of ours, else the builds. A
 * whole address, `//host` or a backslash would lead a person who just typed a password elsewhere.
 */
export function nextPage(asked: string | null): string {
	if (asked === null || !/^\/(?![/\\])/.test(asked) || !URL.canParse(asked, BASE)) return HOME;
	const { origin, pathname, search, hash } = new URL(asked, BASE);
	if (origin !== BASE || pathname.startsWith('//')) return HOME;
	// Signing in again, or a file of the api, is no page to arrive at.
	if (/^\/(sign-in|sign-out|register|api)(\/|$)/.test(pathname)) return HOME;
	return pathname + search + hash;
}

/** The sign-in page that leads back to where somebody wanted to go. */
export function signInPage(from: URL): string {
	return `/sign-in?next=${encodeURIComponent(from.pathname + from.search)}`;
}
