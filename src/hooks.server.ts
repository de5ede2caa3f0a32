import type { Handle, HandleServerError, ServerInit } from '@sveltejs/kit';
import { building } from '$app/environment';
import { log } from '$lib/server/log';
import { tallybarProcess } from '$lib/server/process';
import { start } from '$lib/server/start';

export const init: ServerInit = async () => {
	// The build runs the app once to draw the shell; it must neither need nor make a database.
	if (!building) await start();
};

export const handle: Handle = ({ event, resolve }) => {
	// The server script gives every request an id, whatever the caller sent.
	event.locals.requestId = event.request.headers.get('x-request-id') ?? '';
	const request = event.platform?.req;
	if (request !== undefined) tallybarProcess().routes.set(request, event.route.id ?? '(no route)');
	return resolve(event);
};

export const handleError: HandleServerError = ({ error, event, status, message }) => {
	const { requestId } = event.locals;
	if (status !== 404)
		log().error({ requestId, route: event.route.id, err: error }, 'request failed');
	return { message, requestId };
};
