import { redirect } from '@sveltejs/kit';
import { z } from 'zod';
import { signIn } from '$lib/server/auth/accounts';
import { readSessionCookie, setSessionCookie } from '$lib/server/auth/cookie';
import { getDb } from '$lib/server/db';
import { failed, field } from '$lib/server/desk-form';
import { log } from '$lib/server/logger';
import { nextPage } from '$lib/server/next-page';
import type { Actions, PageServerLoad } from './$types';

const Fields = z.object({ email: field, password: field });

export const load: PageServerLoad = ({ locals, url }) => ({
	person: locals.person,
	next: nextPage(url.searchParams.get('next'))
});

export const actions: Actions = {
	default: async (event) => {
		const { request, cookies, locals, url } = event;
		const { requestId } = locals;
		const { email, password } = Fields.parse(Object.fromEntries(await request.formData()));
		const address = event.getClientAddress();
		const oldToken = readSessionCookie(cookies);
		const result = await signIn(getDb(), { email, password, address, oldToken });
		if (!result.ok) {
			log().warn({ requestId, address, code: result.code }, 'sign-in refused');
			return failed(event, result, { email });
		}
		log().info({ requestId, address, person: result.person.id }, 'signed in');
		setSessionCookie(cookies, result.session);
		redirect(303, nextPage(url.searchParams.get('next')));
	}
};
