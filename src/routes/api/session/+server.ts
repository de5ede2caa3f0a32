import { json } from '@sveltejs/kit';
import type { RequestHandler } from './$types';

/** Who is signed in. The guard answers 401 when nobody is: only that means "signed out" to a device. */
export const GET: RequestHandler = ({ locals }) => json({ person: locals.person });
