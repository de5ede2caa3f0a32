import { personOf } from '$lib/server/log/http';
import { getLog } from '$lib/server/log/log-server';
import type { RequestHandler } from './$types';

/** One stream for all builds of the signed-in person: "the history of this build now reaches this far". */
export const GET: RequestHandler = (event) => {
	const person = personOf(event);
	const stream = getLog().live.open(person, event.locals.session?.id ?? '');
	return new Response(stream, {
		headers: {
			'content-type': 'text/event-stream; charset=utf-8',
			// For proxies that would collect what is sent and pass it on in lumps.
			'x-accel-buffering': 'no'
		}
	});
};
