import type { Handle } from '@sveltejs/kit';
import { refuse } from '../answer';
import { config } from '../config';
import { log } from '../logger';

const SAFE = new Set(['GET', 'HEAD', 'OPTIONS']);

/**
 * Whether an unsafe request comes from our own page. Browsers send Origin with every such request; a
 * few leave it out for same-origin ones, and then say so in Sec-Fetch-Site. No page can forge either.
 */
export function isSameOrigin(headers: Headers, origin: string): boolean {
	const sent = headers.get('origin');
	return sent === null ? headers.get('sec-fetch-site') === 'same-origin' : sent === origin;
}

/**
 * Refuses every unsafe request from elsewhere, whatever its content type. SvelteKit's own check knows
 * the types a form can send; JSON, or no type at all, passes it with the cookie when the page lies on
 * another port or subdomain, which browsers call the same site.
 */
export const sameOrigin: Handle = ({ event, resolve }) => {
	const { request, locals, route } = event;
	if (SAFE.has(request.method) || isSameOrigin(request.headers, config().origin)) {
		return resolve(event);
	}
	const { requestId } = locals;
	log().warn({ requestId, route: route.id, method: request.method }, 'request from another origin');
	return refuse('request.origin', { requestId });
};
