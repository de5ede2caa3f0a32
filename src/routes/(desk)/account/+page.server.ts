import { error } from '@sveltejs/kit';
import { z } from 'zod';
import { changePassword } from '$lib/server/auth/accounts';
import { setSessionCookie } from '$lib/server/auth/cookie';
import { getDb } from '$lib/server/db';
import { failed, field } from '$lib/server/desk-form';
import { log } from '$lib/server/logger';
import type { Actions, PageServerLoad } from './$types';

const Fields = z.object({ current: field, password: field });

// The guard lets nobody in who is not signed in; without it these throw instead of showing nothing.
const signedIn = (locals: App.Locals) => locals.person ?? error(401);

export const load: PageServerLoad = ({ locals }) => ({ person: signedIn(locals) });

export const actions: Actions = {
	password: async (event) => {
		const { request, cookies, locals } = event;
		const { id } = signedIn(locals);
		const { requestId } = locals;
		const fields = Fields.parse(Object.fromEntries(await request.formData()));
		const result = await changePassword(getDb(), { person: id, ...fields });
		const address = event.getClientAddress();
		if (!result.ok) {
			log().warn({ requestId, address, person: id, code: result.code }, 'password change refused');
			return failed(event, result, {});
		}
		log().info({ requestId, address, person: id }, 'password changed');
		setSessionCookie(cookies, result.session);
		return { changed: true };
	}
};
