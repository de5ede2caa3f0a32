import { redirect } from '@sveltejs/kit';
import { signOut } from '$lib/server/auth/accounts';
import { deleteSessionCookie, readSessionCookie } from '$lib/server/auth/cookie';
import { getDb } from '$lib/server/db';
import { log } from '$lib/server/logger';
import type { Actions, PageServerLoad } from './$types';

export const load: PageServerLoad = ({ locals }) => ({ person: locals.person });

export const actions: Actions = {
	default: async ({ cookies, locals }) => {
		const token = readSessionCookie(cookies);
		if (token !== undefined) await signOut(getDb(), { token });
		log().info({ requestId: locals.requestId, person: locals.person?.id }, 'signed out');
		deleteSessionCookie(cookies);
		redirect(303, '/sign-in');
	}
};
