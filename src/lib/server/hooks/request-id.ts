import { randomUUID } from 'node:crypto';
import type { Handle } from '@sveltejs/kit';
import { tallybarProcess } from '../process';

/**
 * Gives the request the id it is logged and answered under. The server script makes it and overwrites
 * what a caller sent; only `vite dev`, which has no such script, needs one made here.
 */
export const requestId: Handle = async ({ event, resolve }) => {
	const made = event.request.headers.get('x-request-id');
	event.locals.requestId = made ?? randomUUID();
	event.locals.person = null;
	event.locals.session = null;
	const request = event.platform?.req;
	if (request !== undefined) tallybarProcess().routes.set(request, event.route.id ?? '(no route)');
	const response = await resolve(event);
	if (made === null) response.headers.set('x-request-id', event.locals.requestId);
	return response;
};
