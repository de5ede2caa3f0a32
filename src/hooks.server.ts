import type { HandleServerError, ServerInit } from '@sveltejs/kit';
import { sequence } from '@sveltejs/kit/hooks';
import { building } from '$app/environment';
import { refusal } from '$lib/logbook/refusals';
import { apiErrors, failureCode } from '$lib/server/hooks/api-errors';
import { guard } from '$lib/server/hooks/guard';
import { noStore } from '$lib/server/hooks/no-store';
import { plainForms } from '$lib/server/hooks/plain-forms';
import { requestId } from '$lib/server/hooks/request-id';
import { sameOrigin } from '$lib/server/hooks/same-origin';
import { samePerson } from '$lib/server/hooks/same-person';
import { session } from '$lib/server/hooks/session';
import { log } from '$lib/server/logger';
import { start } from '$lib/server/start';

export const init: ServerInit = async () => {
	// The build runs the app once to draw the shell; it must neither need nor make a database.
	if (!building) await start();
};

// Outside in: what is nearer to the route may rely on what stands before it.
export const handle = sequence(
	requestId,
	noStore,
	apiErrors,
	sameOrigin,
	plainForms,
	session,
	guard,
	samePerson
);

/** What a person is told of an error nobody foresaw: a sentence and the id to quote, never the error. */
export const handleError: HandleServerError = ({ error, event, status }) => {
	const { requestId: id } = event.locals;
	if (status < 500) {
		const code = status === 404 ? 'request.no_such_page' : 'request.malformed';
		return { message: refusal(code).says, requestId: id };
	}
	log().error({ requestId: id, route: event.route.id, err: error }, 'request failed');
	const code = failureCode(error);
	event.locals.failure = code;
	return { message: refusal(code).says, requestId: id };
};
