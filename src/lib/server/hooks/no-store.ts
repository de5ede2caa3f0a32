import type { Handle } from '@sveltejs/kit';

/**
 * What belongs to a person is kept by no cache: neither the log's answers nor a page with a name on
 * it, which the next person at a shared tablet could go back to.
 */
export const noStore: Handle = async ({ event, resolve }) => {
	const response = await resolve(event);
	const personal =
		event.url.pathname.startsWith('/api/') || event.route.id?.startsWith('/(desk)') === true;
	if (personal) response.headers.set('cache-control', 'no-store');
	return response;
};
