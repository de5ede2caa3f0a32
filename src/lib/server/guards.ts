/**
 * Who may reach a route: everybody, or a signed-in person. What a person may do there (in which
 * build, in which role) is decided by the function behind the route.
 */
export type Guard = 'public' | 'person';

/**
 * Every route of the app by its id. A route that is not listed answers as if it were not there; a
 * test compares the list with the folders. The pages of (shop) are public because the server draws
 * nothing in them: they show what is on the device.
 */
export const GUARDS: Readonly<Record<string, Guard>> = {
	'/': 'public',
	'/shell': 'public',
	'/readyz': 'public',
	'/(shop)/builds': 'public',
	'/(shop)/builds/[build]': 'public',
	'/(shop)/builds/[build]/plan': 'public',
	'/(shop)/builds/[build]/wall': 'public',
	'/(shop)/builds/[build]/bench': 'public',
	'/(shop)/builds/[build]/bench/[seam]': 'public',
	'/(shop)/builds/[build]/logbook': 'public',
	'/(shop)/builds/[build]/logbook/[entry]': 'public',
	'/(shop)/builds/[build]/not-accepted': 'public',
	'/(shop)/builds/[build]/people': 'public',
	'/(shop)/sync': 'public',
	'/(desk)/account': 'person',
	'/(desk)/builds/[build]/crew': 'person',
	'/(desk)/register': 'public',
	'/(desk)/sign-in': 'public',
	// Also for somebody whose session ran out: signing out must always work.
	'/(desk)/sign-out': 'public',
	// Answers only who asks, also when that is nobody.
	'/api/session': 'public',
	'/api/builds': 'person',
	'/api/builds/[build]/entries': 'person',
	'/api/builds/[build]/have': 'person',
	'/api/builds/[build]/crew': 'person',
	'/api/builds/[build]/quarantine': 'person',
	'/api/live': 'person'
};

/** The guard of a route, or undefined when it is not listed: then nobody may. */
export function guardOf(routeId: string): Guard | undefined {
	return Object.hasOwn(GUARDS, routeId) ? GUARDS[routeId] : undefined;
}
