import type { Handle } from '@sveltejs/kit';
import { PERSON_HEADER } from '../../logbook/wire';
import { refuse } from '../answer';

/** What a phone asks for in the name of the store it works from. */
const NAMED = /^\/api\/(builds|live)(\/|$)/;

/**
 * A request that names the person whose store sends it is answered in that person's session only.
 * On a shared tablet another may have signed in meanwhile in a second tab: without this, the lines of
 * one would be offered as the other's, or the other's log be written into the first one's store.
 */
export const samePerson: Handle = ({ event, resolve }) => {
	const { locals, request, url } = event;
	const route: string = event.route.id ?? '';
	if (!route.startsWith('/api/') || locals.person === null) return resolve(event);
	const { requestId } = locals;
	// An event stream cannot send headers.
	const sent =
		route === '/api/live' ? url.searchParams.get('person') : request.headers.get(PERSON_HEADER);
	if (sent === null) {
		return NAMED.test(route) ? refuse('request.malformed', { requestId }) : resolve(event);
	}
	if (sent !== locals.person.id) return refuse('session.other_person', { requestId });
	return resolve(event);
};
