import { isHttpError, isRedirect } from '@sveltejs/kit';
import type { Handle, RequestEvent } from '@sveltejs/kit';
import type { RefusalCode } from '../../logbook/refusals';
import { refuse } from '../answer';
import { log } from '../logger';
import { DiskFullError } from '../write';

/** The refusal for something that was thrown and not foreseen. Logs all but what the caller caused. */
export function failureCode(error: unknown): RefusalCode {
	if (error instanceof DiskFullError) return 'disk.full';
	const code = error instanceof Error && 'code' in error ? String(error.code) : '';
	if (code.startsWith('SQLITE_BUSY')) return 'request.unavailable';
	if (code === 'SQLITE_FULL') return 'disk.full';
	return 'request.internal';
}

const BY_STATUS: Readonly<Record<number, RefusalCode>> = {
	401: 'session.none',
	404: 'request.no_such_page',
	405: 'request.no_such_page',
	413: 'request.too_large',
	503: 'request.unavailable',
	507: 'disk.full'
};

function byStatus(status: number): RefusalCode {
	return BY_STATUS[status] ?? (status >= 500 ? 'request.internal' : 'request.malformed');
}

/**
 * Every error under /api is `{code, says, requestId}`, also where SvelteKit would answer with a page
 * or a line of text: a phone that gets HTML cannot tell whether its lines were refused.
 */
export const apiErrors: Handle = async ({ event, resolve }) => {
	if (!event.url.pathname.startsWith('/api/')) return resolve(event);
	let response: Response;
	try {
		response = await resolve(event);
	} catch (error) {
		if (isRedirect(error)) throw error;
		if (isHttpError(error)) return answer(event, byStatus(error.status), error.status);
		const { requestId } = event.locals;
		log().error({ requestId, route: event.route.id, err: error }, 'request failed');
		return answer(event, failureCode(error));
	}
	if (response.status < 400 || (await isOurs(response))) return response;
	// handleError, which ran before, knows what was thrown.
	const { failure } = event.locals;
	if (failure !== undefined && response.status >= 500) return answer(event, failure);
	return answer(event, byStatus(response.status), response.status, response.headers.get('allow'));
};

function answer(
	event: RequestEvent,
	code: RefusalCode,
	status?: number,
	allow?: string | null
): Response {
	const { requestId } = event.locals;
	return refuse(code, {
		requestId,
		...(status !== undefined && { status }),
		...(typeof allow === 'string' && { headers: { allow } })
	});
}

async function isOurs(response: Response): Promise<boolean> {
	if (response.headers.get('content-type')?.startsWith('application/json') !== true) return false;
	const body: unknown = await response.clone().json();
	return typeof body === 'object' && body !== null && 'code' in body;
}
