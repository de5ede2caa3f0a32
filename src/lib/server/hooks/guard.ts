import { error, redirect } from '@sveltejs/kit';
import type { Handle } from '@sveltejs/kit';
import { refusal } from '../../logbook/refusals';
import { refuse } from '../answer';
import { guardOf } from '../guards';
import { signInPage } from '../next-page';

/**
 * Lets through what the table of guards allows. Under /api somebody who is not signed in gets 401 as
 * JSON, never a redirect: a phone would follow it and take the sign-in page for an answer.
 */
export const guard: Handle = ({ event, resolve }) => {
	const { route, locals, url } = event;
	const { requestId, person } = locals;
	// No route: SvelteKit answers 404 by itself.
	if (route.id === null) return resolve(event);
	const api = route.id.startsWith('/api/');
	switch (guardOf(route.id)) {
		case 'public':
			return resolve(event);
		case 'person':
			if (person !== null) return resolve(event);
			if (api) return refuse('session.none', { requestId });
			return redirect(303, signInPage(url));
		case undefined:
			if (api) return refuse('request.no_such_page', { requestId });
			return error(404, { message: refusal('request.no_such_page').says, requestId });
	}
};
