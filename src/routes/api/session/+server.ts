import { json } from '@sveltejs/kit';
import type { RequestHandler } from './$types';

/** Who is signed in: nobody is an answer too. "Signed out" is a 401, which every request of the log gets then. */
export const GET: RequestHandler = ({ locals }) => json({ person: locals.person });
