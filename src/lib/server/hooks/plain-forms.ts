import type { Handle } from '@sveltejs/kit';

/**
 * Answers a form as a browser without JavaScript expects it, unless our own page asked otherwise. For
 * a caller that accepts anything, SvelteKit would wrap the outcome in JSON under status 200, and a
 * proxy or a program counting refused sign-ins (400, 429) would see none.
 */
export const plainForms: Handle = ({ event, resolve }) => {
	const { headers, method } = event.request;
	if (method === 'POST' && event.route.id?.startsWith('/(desk)') === true) {
		if (!headers.has('x-sveltekit-action')) headers.set('accept', 'text/html');
	}
	return resolve(event);
};
